import { join } from 'node:path';
import { deserialize } from 'node:v8';
import SQLite from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { formerFingerprint } from '../../src/adapters/history/checkpoints.js';
import type { SiteConfig } from '../../src/config/site.js';
import { NORMAL } from '../../src/core/alarm/state.js';
import type { UnitDefinition } from '../../src/core/definitions.js';
import { fastClock } from '../../src/daemon.js';
import { waitFor } from '../support/wait.js';
import { fakeCore } from './fakeCore.js';
import {
  count,
  counted,
  makeDaemon,
  publisher,
  publishScan,
  storedEntries,
  storedEstimates,
} from './harness.js';
import { PERIOD_MS, smallSite } from './site.js';

const START = Date.now() - 100 * PERIOD_MS;

/** Changes a stopped daemon's history as a crash or a damage would. */
function change(site: SiteConfig, sql: string): void {
  const database = new SQLite(join(site.store.folder, 'history.sqlite'));
  database.exec(sql);
  database.close();
}

function storedTimes(site: SiteConfig, table: 'profiles' | 'estimates'): number[] {
  const database = new SQLite(join(site.store.folder, 'history.sqlite'));
  const times = database.prepare(`SELECT time FROM ${table} ORDER BY time`).pluck().all();
  database.close();
  return times as number[];
}

/** What the newest checkpoint of a stopped daemon holds. */
function lastImage(site: SiteConfig): unknown {
  const database = new SQLite(join(site.store.folder, 'history.sqlite'));
  const image = database
    .prepare(`SELECT image FROM checkpoints WHERE time = ${LAST}`)
    .pluck()
    .get();
  database.close();
  return deserialize(image as Buffer);
}

/** A site whose daemon has taken in 80 scans, with checkpoints every ten, and was stopped. */
async function worked(): Promise<SiteConfig> {
  const made = smallSite(null);
  const site = { ...made, store: { ...made.store, checkpoint_every_s: 300 } };
  const daemon = makeDaemon(site);
  const { broker } = await daemon.start();
  const client = await publisher(broker);
  for (let i = 0; i < 80; i++) {
    await publishScan(client, START + i * PERIOD_MS, [300 + i, 310 + Math.sin(i), 320, i]);
  }
  await counted(daemon, 'scans', 80);
  await daemon.stop();
  return site;
}

async function restarted(site: SiteConfig): Promise<Record<string, number>> {
  const daemon = makeDaemon(site);
  await daemon.start();
  await daemon.stop();
  return daemon.service.counters();
}

const LAST = '(SELECT max(time) FROM checkpoints)';

describe('a daemon that was killed', () => {
  it('restores its last checkpoint and makes the scans since again, to the last bit', async () => {
    const site = await worked();
    const before = storedEstimates(site);
    // The checkpoint of the clean stop, and all estimates behind the one before.
    change(
      site,
      `DELETE FROM checkpoints WHERE time = ${LAST};
       DELETE FROM estimates WHERE time > ${LAST}; DELETE FROM events; DELETE FROM alarms;`,
    );
    const left = storedEstimates(site).length;
    expect(left).toBeGreaterThan(60);
    expect(left).toBeLessThan(80);
    const counters = await restarted(site);
    expect(storedEstimates(site)).toEqual(before);
    expect(counters.scans).toBe(80 - left);
    // What is replayed was counted when it came.
    expect(counters.taken).toBe(0);
  });

  it('keeps one profile per ten minutes, however often it saves itself, and the last before a stop', async () => {
    const site = await worked();
    const stored = storedTimes(site, 'profiles');
    const all = storedTimes(site, 'estimates');
    const stretchOf = (time_ms: number) => Math.floor(time_ms / 600_000);
    const firsts = all.filter((time, i) => i === 0 || stretchOf(time) !== stretchOf(all[i - 1]!));
    expect(firsts.length).toBeGreaterThan(3);
    expect(stored).toEqual([...new Set([...firsts, all.at(-1)!])]);
    change(
      site,
      `DELETE FROM checkpoints WHERE time = ${LAST}; DELETE FROM estimates WHERE time > ${LAST};`,
    );
    await restarted(site);
    expect(storedTimes(site, 'profiles')).toEqual(stored);
  });

  it('before its first checkpoint makes everything again from the journal', async () => {
    const site = await worked();
    const before = storedEstimates(site);
    change(
      site,
      `DELETE FROM checkpoints; DELETE FROM rewind_points; DELETE FROM estimates;
       DELETE FROM dispatch;`,
    );
    await restarted(site);
    expect(storedEstimates(site)).toEqual(before);
  });

  it('with a checkpoint that is damaged goes back to the one before', async () => {
    const site = await worked();
    const before = storedEstimates(site);
    change(
      site,
      `UPDATE checkpoints SET image = x'ff0f22' WHERE time = ${LAST}; DELETE FROM estimates;`,
    );
    await restarted(site);
    const after = storedEstimates(site);
    expect(after.length).toBeGreaterThan(0);
    expect(after).toEqual(before.slice(-after.length));
  });

  it('with another definition of its unit starts afresh, says that old alarms are void, and goes on', async () => {
    const site = await worked();
    const { id, state } = { id: 'u/data_stale/unit', state: 'unacknowledged' };
    const alarm = JSON.stringify({ ...NORMAL, state, active: true, raised_ms: START });
    const standing = `'${id}', 'u', 'data_stale', '${state}', NULL, '${alarm}'`;
    const event = {
      ...{ id: 'u/data_stale/unit', unit: 'u', kind: 'data_stale', class: 'alert' },
      ...{ priority: 'high', subject: 'unit', transition: 'raised', message: 'no data' },
      ...{ time: new Date(START).toISOString(), value: null, limit: null },
    };
    change(site, `INSERT INTO alarms VALUES (${standing}, '${JSON.stringify(event)}')`);
    const [unit] = site.units;
    const changed = { ...unit, rated_hours: 7 } as UnitDefinition;
    const daemon = makeDaemon({ ...site, units: [changed] });
    await daemon.start();
    expect(daemon.service.standing()).toMatchObject([{ state: 'returned_unacknowledged' }]);
    expect(daemon.service.events('u', 0, Date.now() + 1e6, 10)).toMatchObject([
      { transition: 'returned', message: expect.stringContaining('started afresh') },
    ]);
    expect(count(daemon, 'scans')).toBe(80);
    // A loss of what was learned is counted, and told by name.
    expect(count(daemon, 'baselines_lost')).toBe(1);
    expect(daemon.service.health().find(({ name }) => name === 'unit u')?.detail).toContain(
      'what was healthy was lost at this start and is learned anew: every indicator',
    );
    await daemon.stop();
  });

  it('with another name, limits, watch or asked powers goes on from its checkpoint, to the bit', async () => {
    const site = await worked();
    const saved = lastImage(site);
    const [unit] = site.units as [UnitDefinition];
    const edited: UnitDefinition = {
      ...unit,
      name: 'Renamed',
      hours_at_W: [2e6],
      limits: { ...unit.limits, hot_outlet_min_K: 600, availability: 0.9 },
      watch: { ...unit.watch, data_age_s: { ...unit.watch.data_age_s, limit: 500 } },
    };
    const counters = await restarted({ ...site, units: [edited] });
    expect(counters).toMatchObject({ scans: 0, baselines_lost: 0 });
    expect(lastImage(site)).toEqual(saved);
  });

  it('goes on from a checkpoint of a build that took a print of the whole definition', async () => {
    const site = await worked();
    const former = formerFingerprint(site.units[0] as UnitDefinition);
    change(site, `UPDATE checkpoints SET fingerprint = '${former}'`);
    expect(await restarted(site)).toMatchObject({ scans: 0, baselines_lost: 0 });
  });
});

describe('a daemon at a plant that is silent since before its start', () => {
  it('closes empty scans all the same, so that the age of the data is seen', async () => {
    const site = await worked();
    const daemon = makeDaemon(site, { clock: fastClock(Date.now(), 600) });
    await daemon.start();
    await counted(daemon, 'scans_empty', 3);
    // The channel that reports by exception holds for some scans more.
    await expect
      .poll(() => daemon.service.standing(), { timeout: 10_000 })
      .toMatchObject([{ kind: 'data_stale' }]);
    await daemon.stop();
  });
});

describe('hours', () => {
  it('are there after a change of mode, without waiting for the next stroke of the clock', async () => {
    const site = smallSite(null);
    let mode: 'stand' | 'charge' = 'stand';
    const daemon = makeDaemon(site, {
      core: {
        ...fakeCore,
        advance(...args) {
          const step = fakeCore.advance(...args);
          return { ...step, estimate: { ...step.estimate, mode } };
        },
      },
    });
    const { broker } = await daemon.start();
    const client = await publisher(broker);
    await waitFor('the link', () => daemon.service.health()[0]!.ok);
    const stroke = Math.ceil(START / 600_000) * 600_000;
    await publishScan(client, stroke, [1, 2, 3]);
    await counted(daemon, 'scans', 1);
    expect(daemon.service.now('u')!.dispatch!.time).toBe(new Date(stroke).toISOString());
    mode = 'charge';
    await publishScan(client, stroke + PERIOD_MS, [1, 2, 3]);
    const changed = new Date(stroke + PERIOD_MS).toISOString();
    await waitFor('new hours', () => daemon.service.now('u')!.dispatch!.time === changed);
    await daemon.stop();
    expect(storedEstimates(site).filter((one) => one.dispatch)).toHaveLength(1);
  });
});

describe('a core that fails on a scan', () => {
  it('costs that scan, is counted and shown, and the daemon goes on', async () => {
    const site = smallSite(null);
    let isBroken = false;
    const daemon = makeDaemon(site, {
      core: {
        ...fakeCore,
        advance(...args) {
          if (isBroken) throw new Error('a covariance has lost its sign');
          return fakeCore.advance(...args);
        },
      },
    });
    const { broker } = await daemon.start();
    const client = await publisher(broker);
    await publishScan(client, START, [1, 2, 3]);
    await counted(daemon, 'scans', 1);
    isBroken = true;
    await publishScan(client, START + PERIOD_MS, [1, 2, 3]);
    await counted(daemon, 'scan_failures', 1);
    const unitPart = () => daemon.service.health().find(({ name }) => name === 'unit u');
    expect(unitPart()).toMatchObject({
      ok: false,
      detail: 'the last scan failed: a covariance has lost its sign',
    });
    isBroken = false;
    await publishScan(client, START + 2 * PERIOD_MS, [1, 2, 3]);
    await counted(daemon, 'scans', 2);
    expect(unitPart()?.detail).toContain('newest reading');
    await daemon.stop();
    expect(storedEstimates(site)).toHaveLength(2);
    expect(storedEntries(site).filter((entry) => entry.kind === 'reading')).toHaveLength(9);
  });
});
