import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { History } from '../../src/adapters/history/history.js';
import { Journal, type JournalReading } from '../../src/adapters/history/journal.js';
import type { UnitDefinition } from '../../src/core/definitions.js';
import type { UnitState } from '../../src/core/unit.js';
import { watchEvent } from '../../src/core/watch/kinds.js';
import { SteadyClock } from '../../src/daemon/clock.js';
import type { ClockReturnState } from '../../src/daemon/clockReturn.js';
import { realCore } from '../../src/daemon/core.js';
import { Counters } from '../../src/daemon/counters.js';
import { unitHealth } from '../../src/daemon/health.js';
import { restoreRunner } from '../../src/daemon/restore.js';
import { UnitRunner } from '../../src/daemon/unitRunner.js';
import { createLog } from '../../src/log.js';
import { frontedScan } from '../core/track/fronted.js';
import { coldStore, hotBed, hotStore, unitOf } from '../core/track/plants.js';
import { temporaryFolder } from '../support/folders.js';
import { mulberry } from '../support/random.js';
import { later } from './harness.js';

const unit = unitOf();
const PERIOD_MS = unit.scan_period_s * 1000;
const T = Date.UTC(2026, 0, 1);
const STORE = {
  ...{ folder: '', keep_readings_days: 30, keep_estimates_days: 365 },
  ...{ thin_after_days: 30, thin_to_s: 600, checkpoint_every_s: 600 },
};
const ASSEMBLY = { deadline_ms: 10_000, future_tolerance_ms: 300_000, longest_gap_scans: 2000 };

/** Journal, history and what a restart needs of a daemon, with `now` at a scan. */
function placed(folder: string, now_ms: number) {
  const journal = new Journal(join(folder, 'journal.sqlite'));
  const history = new History(join(folder, 'history.sqlite'), STORE);
  journal.start();
  history.start();
  later(async () => {
    journal.stop();
    history.stop();
  });
  const clock = { now: () => now_ms, speed: 1 };
  const lines: string[] = [];
  const log = createLog({ level: 'silent' });
  log.warn = (...words: unknown[]) => void lines.push(words.map(String).join(' '));
  const counters = new Counters();
  const steady = new SteadyClock(clock, 60_000);
  return { journal, history, clock, steady, counters, log, lines };
}

type Placed = ReturnType<typeof placed>;

/** A charge's readings of the n-th to before the m-th scan, into the journal. */
function append({ journal }: Placed, n: number, m: number): void {
  const random = mulberry(7 + n);
  const readings: JournalReading[] = [];
  for (let i = n; i < m; i++) {
    const gas = { hot_top: 733, hot_bottom: 299, cold_bottom: 144.5, cold_top: 297 };
    const others = { ...gas, flow: 0.9, mode: 1, power: 90e3, ambient: 283 };
    const front = 0.2 + 0.0012 * i;
    const noise = () => random() - 0.5;
    const time_ms = T + i * PERIOD_MS;
    const { values } = frontedScan(unit, time_ms, { hot: front, cold: front }, others, noise);
    unit.channels.forEach(({ id: channel }, c) => {
      const value = values[c] as number;
      const arrival_ms = time_ms + 500;
      readings.push({ unit: unit.id, channel, time_ms, arrival_ms, value, quality: 'good' });
    });
  }
  journal.append(readings);
}

/** Works off the journal; returns the events told, by their scan. */
function workOff(runner: UnitRunner, { journal }: Placed): string[] {
  const told: string[] = [];
  for (const entry of journal.read(runner.seq, 1e6)) {
    runner.take(entry, 0);
    for (let step = runner.step(); step !== null; step = runner.step())
      told.push(...step.step.events.map(({ id, transition }) => `${id} ${transition}`));
  }
  return told;
}

const runnerOf = (of: UnitDefinition) => new UnitRunner(of, realCore, ASSEMBLY);
const stateOf = (runner: UnitRunner): UnitState => runner.snapshot().state;
const transferOf = ({ watch }: UnitState, store: string) =>
  (watch.indicators as { heat_transfer: Record<string, { follow: unknown }> }).heat_transfer[store];

const SAVED_AT = 40;

/** A unit that has charged a while, with a checkpoint, and alerts of both stores that stand. */
function worked(): { place: Placed; folder: string; saved: UnitState } {
  const folder = temporaryFolder('carry');
  const place = placed(folder, T + SAVED_AT * PERIOD_MS);
  append(place, 0, SAVED_AT);
  const runner = runnerOf(unit);
  workOff(runner, place);
  const parts = { unit: 'u', kind: 'heat_transfer_low', transition: 'raised' } as const;
  for (const subject of ['hot', 'cold']) {
    const figures = { value: null, limit: null, message: 'lower', time_ms: T };
    place.history.events.add(watchEvent({ ...parts, subject, ...figures }));
  }
  place.history.checkpoints.add(unit, runner.checkpoint() as never);
  return { place, folder, saved: stateOf(runner) };
}

/** Changes what the checkpoint holds. */
function rewrite(
  { history }: Placed,
  change: (image: { shape?: unknown; unit: { state: UnitState } }) => unknown,
): void {
  const [checkpoint] = history.checkpoints.list(unit);
  if (checkpoint === undefined) throw new Error('no checkpoint');
  const image = checkpoint.load() as Parameters<typeof change>[0];
  change(image);
  const { time_ms, journal_seq } = checkpoint;
  history.checkpoints.add(unit, { time_ms, journal_seq, image });
}

describe('a changed store', () => {
  const changed = unitOf({
    stores: [hotStore({ bed: hotBed({ void_fraction: 0.37 }) }), coldStore()],
  });

  it('costs what was learned of it, loudly, and nothing of the other; its bed begins from the journal', () => {
    const { place, saved } = worked();
    const { history, counters, clock, lines } = place;
    const runner = runnerOf(changed);
    restoreRunner(runner, place);
    expect(counters.get('baselines_lost')).toBe(runner.lost.length);
    expect(runner.lost).toContain('heat_transfer/hot');
    expect(runner.lost.filter((name) => name.includes('cold'))).toEqual([]);
    expect(lines.join()).toMatch(/begun anew: bed of hot.*lost.*heat_transfer\/hot/);
    const { detail } = unitHealth(runner, undefined, clock, 0);
    expect(detail).toMatch(/what was healthy was lost at this start .* and \d+ more/);
    expect(history.alarms.active('u').map(({ subject }) => subject)).toEqual(['cold']);
    // Up to the checkpoint's time nothing is told again, nor saved.
    expect(workOff(runner, place)).toEqual([]);
    expect(runner.checkpoint()).toBeNull();
    expect(stateOf(runner).stores[0]?.started).toBe(true);
    append(place, SAVED_AT, SAVED_AT + 3);
    workOff(runner, place);
    const state = stateOf(runner);
    expect(transferOf(state, 'cold')?.follow).toEqual(transferOf(saved, 'cold')?.follow);
    expect(state.watch.conditions['heat_transfer_low/cold']?.raised).toBe(true);
    expect(state.watch.conditions['heat_transfer_low/hot']).toBeUndefined();
    expect(state.cycle?.no).toBe(saved.cycle?.no);
    // The bed of the changed store has had the whole journal, not only three scans.
    expect(state.stores[0]?.known_s).toBeGreaterThan(30 * unit.scan_period_s);
    expect(runner.unsaved).toBe(true);
    expect(runner.checkpoint()).not.toBeNull();
  });

  it('is gone on with by the next start as by an unchanged unit', () => {
    const { place } = worked();
    const runner = runnerOf(changed);
    restoreRunner(runner, place);
    append(place, SAVED_AT, SAVED_AT + 3);
    workOff(runner, place);
    place.history.checkpoints.add(changed, runner.checkpoint() as never);
    const next = runnerOf(changed);
    restoreRunner(next, place);
    expect(next.lost).toEqual([]);
    expect(stateOf(next)).toEqual(stateOf(runner));
  });

  it('makes the unit no younger: clocks that are set back do not begin it anew the sooner', () => {
    const { place } = worked();
    let before: unknown;
    rewrite(place, (image) => {
      const { clocks } = image as unknown as { clocks: ClockReturnState };
      before = clocks.begun;
      Object.assign(clocks, { scans: 1_000_000 });
    });
    const runner = runnerOf(changed);
    restoreRunner(runner, place);
    append(place, SAVED_AT, SAVED_AT + 3);
    workOff(runner, place);
    const { scans, begun } = runner.clocks.save(true);
    expect(scans).toBeGreaterThan(1_000_000);
    expect(begun).toEqual(before);
    expect(begun).toMatchObject({ time_ms: T });
  });

  it('costs everything where the saved state does not tell its definition, and says so', () => {
    const { place } = worked();
    rewrite(place, (image) => delete image.shape);
    const runner = runnerOf(changed);
    restoreRunner(runner, place);
    expect(runner.lost).toEqual(['every indicator']);
    expect(place.counters.get('baselines_lost')).toBe(1);
    expect(place.lines.join()).toMatch(/does not tell its definition/);
    expect(place.history.alarms.active('u')).toEqual([]);
  });
});

describe('a build whose indicators are of another shape', () => {
  it('tells which it begins anew', () => {
    const { place, saved } = worked();
    rewrite(place, ({ unit: { state } }) => {
      state.watch.indicators_version = 0;
    });
    const runner = runnerOf(unit);
    restoreRunner(runner, place);
    expect(runner.lost).toContain('spread_ratio');
    expect(place.counters.get('baselines_lost')).toBe(14);
    expect(stateOf(runner).stores).toEqual(saved.stores);
  });
});
