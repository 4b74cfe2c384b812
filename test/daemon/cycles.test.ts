import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import type { SiteConfig } from '../../src/config/site.js';
import type { Mode } from '../../src/core/definitions.js';
import type { UnitState } from '../../src/core/unit.js';
import type { WatchView } from '../../src/core/watch/causes.js';
import type { CycleScan } from '../../src/core/watch/cycle/cycleScan.js';
import {
  type CycleLogState,
  cycleRules,
  startCycleLog,
  stepCycleLog,
} from '../../src/core/watch/cycleLog.js';
import type { CycleRecord } from '../../src/core/watch/cycleRecord.js';
import type { Core } from '../../src/daemon/core.js';
import { script } from '../core/watch/cycleScript.js';
import { waitFor } from '../support/wait.js';
import { fakeCore } from './fakeCore.js';
import { counted, makeDaemon, publisher, publishScan } from './harness.js';
import { PERIOD_MS, smallSite } from './site.js';

const START = Date.now() - 400 * PERIOD_MS;
const MODES: readonly Mode[] = ['stand', 'charge', 'stand', 'discharge', 'stand'];
const EACH = 30;
/** An odd number, so that the last one is said. */
const SCANS = MODES.length * EACH + 1;
const isoOf = (scan: number) => new Date(START + scan * PERIOD_MS).toISOString();

/** The fake core with a real cycle log: the first channel tells 1 charge, 0 stand, -1 discharge. */
const cyclingCore: Core = {
  ...fakeCore,
  advance(unit, state, scan, ask) {
    const own = state as UnitState & { cycle?: CycleLogState };
    own.cycle ??= startCycleLog();
    const step = fakeCore.advance(unit, state, scan, ask);
    const told = scan.values[0]!;
    const mode: Mode = told > 0.5 ? 'charge' : told < -0.5 ? 'discharge' : 'stand';
    const [like] = script([{ mode, scans: 1 }]);
    const seen: CycleScan = { ...(like as CycleScan), time_ms: scan.time_ms };
    const cycle = stepCycleLog(cycleRules(unit), own.cycle, seen, []);
    const watch: WatchView = watchOf(unit.id, step.estimate.time, mode);
    return { ...step, watch, ...(cycle ? { cycle } : {}) };
  },
};

/** Degraded while it charges. */
function watchOf(unit: string, time: string, mode: Mode): WatchView {
  return {
    ...{ time, unit, causes: [] },
    indicators: [
      {
        ...{ kind: 'heat_transfer', subject: 'hot', value: 1, sigma: 0.1, unit: '-' },
        ...{ healthy: 1, healthy_from: 'learned', limit: 0.7, deadband: 0.1 },
        ...{ on_delay_s: 0, off_delay_s: 0, score: 0, reason: null, time, sentence: 's' },
        state: mode === 'charge' ? 'degraded' : 'normal',
      },
    ],
  };
}

/** A site whose daemon has taken in the whole schedule and was stopped, and what was said of the watch. */
async function worked() {
  const made = smallSite(null);
  const site = { ...made, store: { ...made.store, checkpoint_every_s: 900 } };
  const daemon = makeDaemon(site, { core: cyclingCore });
  const { broker } = await daemon.start();
  const client = await publisher(broker);
  const said: WatchView[] = [];
  client.on('message', (_topic, payload) => said.push(JSON.parse(payload.toString())));
  await client.subscribeAsync('out/u/watch');
  for (let i = 0; i < SCANS; i++) {
    const mode = MODES[Math.floor(i / EACH)] ?? 'stand';
    const told = mode === 'charge' ? 1 : mode === 'discharge' ? -1 : 0;
    await publishScan(client, START + i * PERIOD_MS, [told, 1, 2, i]);
  }
  await counted(daemon, 'scans', SCANS);
  await waitFor('the watch to be said', () => said.at(-1)?.time === isoOf(SCANS - 1));
  const { service } = daemon;
  const cycles = service.cycles('u', 0, 8.64e15, undefined, 100);
  const watch = service.watch('u');
  expect(() => service.cycles('v', 0, 1, undefined, 1)).toThrow(RangeError);
  await daemon.stop();
  return { site, cycles, watch, said };
}

function stored(site: SiteConfig, sql: string): unknown[] {
  const database = new SQLite(join(site.store.folder, 'history.sqlite'));
  const statement = database.prepare(sql);
  const rows = statement.reader ? statement.pluck().all() : [statement.run()];
  database.close();
  return rows;
}

const kinds = (cycles: readonly CycleRecord[]) => cycles.map(({ kind }) => kind);

describe('the cycle log of a daemon', () => {
  it('enters each run, the same after a kill that lost the last of them, and once', async () => {
    const { site, cycles, watch, said } = await worked();
    expect(kinds(cycles)).toEqual(MODES.slice(0, 4));
    expect(Date.parse(cycles[1]!.from)).toBe(START + (EACH - 0.5) * PERIOD_MS);
    expect(watch?.indicators[0]?.state).toBe('normal');

    // Of a topic only the newest waits for a broker that is slower than the plant.
    expect(said.length).toBeLessThanOrEqual(SCANS / 2 + 3);
    expect(said.at(-1)).toEqual(watch);
    const times = stored(site, "SELECT time FROM watch WHERE unit = 'u' ORDER BY time") as number[];
    expect(times).toContain(START + EACH * PERIOD_MS);
    expect(times).toContain(START + 2 * EACH * PERIOD_MS);
    expect(times.length).toBeLessThan(SCANS / 10);

    // The discharge ended with scan 119 and was known to be over with scan 139.
    const lost = START + 130 * PERIOD_MS;
    stored(site, `DELETE FROM checkpoints WHERE time > ${lost}`);
    stored(site, `DELETE FROM estimates WHERE time > ${lost}`);
    stored(site, "DELETE FROM cycles WHERE kind = 'discharge'");
    expect(stored(site, 'SELECT count(*) FROM checkpoints')).toEqual([2]);
    const again = makeDaemon(site, { core: cyclingCore });
    await again.start();
    await again.caughtUp();
    expect(again.service.cycles('u', 0, 8.64e15, undefined, 100)).toEqual(cycles);
    expect(again.service.watch('u')).toEqual(watch);
    await again.stop();

    // Without any checkpoint: all of the journal again, and nothing is entered twice.
    stored(site, 'DELETE FROM checkpoints');
    stored(site, 'DELETE FROM rewind_points');
    const afresh = makeDaemon(site, { core: cyclingCore });
    await afresh.start();
    await afresh.caughtUp();
    expect(afresh.service.cycles('u', 0, 8.64e15, 'stand', 100)).toEqual(
      cycles.filter(({ kind }) => kind === 'stand'),
    );
    await afresh.stop();
  });
});
