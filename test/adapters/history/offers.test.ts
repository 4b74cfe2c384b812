import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { afterEach, describe, expect, it } from 'vitest';
import { openDatabase } from '../../../src/adapters/history/database.js';
import { History } from '../../../src/adapters/history/history.js';
import { removeSurplusOffers } from '../../../src/adapters/history/retention.js';
import { HISTORY_SCHEMA } from '../../../src/adapters/history/schema.js';
import type { OffersAsk } from '../../../src/core/plan/offerAsk.js';
import { offerTable } from '../../../src/core/plan/offerTable.js';
import { reportOffers } from '../../../src/daemon/offerReports.js';
import { unit } from '../../core/plan/offerUnit.js';
import { temporaryFolder } from '../../support/folders.js';
import { scriptedOffers } from '../http/scriptedOffers.js';
import { estimate } from './unit.js';

const T = Date.UTC(2026, 0, 1);
const HOUR = 3_600_000;
const DAY = 24 * HOUR;
const STORE = {
  folder: '',
  keep_readings_days: 10,
  keep_estimates_days: 100,
  thin_after_days: 50,
  thin_to_s: 600,
  checkpoint_every_s: 600,
};

let history: History | null = null;

function opened(folder: string): History {
  history = new History(join(folder, 'history.sqlite'), STORE);
  history.start();
  return history;
}

afterEach(() => {
  history?.stop();
  history = null;
});

/** A table that was asked at a time for a start three hours on, of 1 MW over `energy_MWh`. */
function table(asked_ms: number, energy_MWh = 4) {
  const ask: OffersAsk = {
    ...{ powers_W: [1e6], starts_ms: [asked_ms + 3 * HOUR], block_s: 900, certainties: [0.5, 0.9] },
  };
  const offers = scriptedOffers(ask, asked_ms, energy_MWh);
  const time = new Date(asked_ms).toISOString();
  return { ask, answer: { time, unit: 'u', ...offerTable(offers, ask, asked_ms, null) } };
}

function keep(own: History, asked_ms: number, energy_MWh?: number): number {
  const { ask, answer } = table(asked_ms, energy_MWh);
  return own.offers.add('u', asked_ms, asked_ms, ask, answer);
}

describe('kept offers', () => {
  it('come back as they were answered, after a restart too', () => {
    const folder = temporaryFolder('offers');
    const own = opened(folder);
    const { ask, answer } = table(T);
    expect(own.offers.add('u', T, T, ask, answer)).toBe(1);
    own.stop();
    const again = opened(folder);
    expect(again.offers.answer('u', 1)).toEqual(answer);
    expect(again.offers.answer('other', 1)).toBeNull();
    const [kept] = again.offers.between('u', T, T, 10);
    expect(kept).toMatchObject({ no: 1, asked_ms: T, time_ms: T, asked: ask });
    expect(kept!.offers[0]).not.toHaveProperty('blocks');
  });

  it('cannot be rewritten, and the same question asked again is a table of its own', () => {
    const folder = temporaryFolder('offers');
    const own = opened(folder);
    keep(own, T);
    keep(own, T, 5);
    own.stop();
    const database = new SQLite(join(folder, 'history.sqlite'));
    const change = database.prepare("UPDATE offers SET summary = '{}' WHERE no = 1");
    expect(() => change.run()).toThrow('offers are never rewritten');
    database.close();
    const again = opened(folder);
    expect(again.offers.answer('u', 1)).toEqual(table(T).answer);
    expect(again.offers.answer('u', 2)).toEqual(table(T, 5).answer);
  });

  it('go with the retention of estimates, and their numbers are not given again', () => {
    const own = opened(temporaryFolder('offers'));
    keep(own, T);
    keep(own, T + DAY);
    own.retain(T + 100.5 * DAY, Number.POSITIVE_INFINITY);
    expect(own.offers.between('u', 0, T + 10 * DAY, 10).map(({ no }) => no)).toEqual([2]);
    own.retain(T + 102 * DAY, Number.POSITIVE_INFINITY);
    expect(own.offers.between('u', 0, T + 10 * DAY, 10)).toEqual([]);
    expect(keep(own, T + 102 * DAY)).toBe(3);
  });

  it('beyond so many tables or bytes of a unit the oldest go, and are counted', () => {
    const folder = temporaryFolder('offers');
    const own = opened(folder);
    for (let i = 0; i < 6; i++) keep(own, T + i);
    own.stop();
    const database = new SQLite(join(folder, 'history.sqlite'));
    const numbers = () => database.prepare('SELECT no FROM offers ORDER BY no').pluck().all();
    expect(removeSurplusOffers(database, { tables: 6, bytes: 1e9 })).toBe(0);
    expect(removeSurplusOffers(database, { tables: 4, bytes: 1e9 })).toBe(2);
    expect(numbers()).toEqual([3, 4, 5, 6]);
    const size = database
      .prepare('SELECT length(content) + length(summary) FROM offers WHERE no = 6')
      .pluck()
      .get() as number;
    // Room for two, each of about the same size.
    expect(removeSurplusOffers(database, { tables: 4, bytes: 2.5 * size })).toBe(2);
    expect(numbers()).toEqual([5, 6]);
    database.close();
    const counts = opened(folder).retain(T + 101 * DAY, Number.POSITIVE_INFINITY);
    expect(counts.offers).toBe(2);
  });

  it('are added to a history that was written before there were any', () => {
    const folder = temporaryFolder('offers');
    const file = join(folder, 'history.sqlite');
    openDatabase(file, 'normal', HISTORY_SCHEMA.slice(0, 1)).close();
    expect(keep(opened(folder), T)).toBe(1);
  });
});

describe('the report from the stored scans', () => {
  it('finds the discharge that puts an offer to the test', async () => {
    const own = opened(temporaryFolder('offers'));
    keep(own, T, 4);
    const limit_K = unit.limits.hot_outlet_min_K as number;
    own.write(() => {
      for (let at = T; at <= T + 9 * HOUR; at += 60_000) {
        const h = (at - T) / HOUR;
        const runs = h >= 3 && h < 7;
        const plain = estimate(at, 0.5, { mode: runs ? 'discharge' : 'stand' });
        const stores = {
          ...plain.stores,
          hot: { ...plain.stores.hot!, outlet_K: runs ? limit_K + 30 * (7 - h) : null },
        };
        // As it is metered: what is given is below 0.
        const measured = { flow_kg_s: runs ? -1 : 0, power_MW_el: runs ? -1 : 0.006 };
        own.estimates.add(unit, { ...plain, stores }, measured);
      }
    });
    const report = await reportOffers(own, unit, T - DAY, T + DAY);
    expect(report.tested).toHaveLength(1);
    expect(report.tested[0]).toMatchObject({
      ...{ no: 1, ended_by: 'hot_outlet', kept: { p90: true } },
    });
    expect(report.tested[0]!.delivered_MWh_el).toBeCloseTo(4, 1);
    expect((await reportOffers(own, unit, T + DAY, T + 2 * DAY)).p90.of).toBe(0);
    expect(report).toMatchObject({ tables: 1, older_left_out: false });
  });

  it('takes the newest tables, page by page, and says where older ones are left out', async () => {
    const own = opened(temporaryFolder('offers'));
    for (let i = 0; i < 130; i++) keep(own, T + i * 1000);
    const asked = (most: number) => reportOffers(own, unit, T, T + DAY, most);
    expect(await asked(130)).toMatchObject({ tables: 130, older_left_out: false });
    expect(await asked(129)).toMatchObject({ tables: 129, older_left_out: true });
  });
});
