import { describe, expect, it } from 'vitest';
import { KIND_CLASSES } from '../../src/core/watch/kinds.js';
import {
  BRANCHES,
  type Branch,
  branchSegments,
  changesOf,
  GEOMETRY,
  lotOf,
} from '../../tools/watch/branches.js';
import { DEGRADATION, expectedOf, isOf } from '../../tools/watch/expected.js';
import { judge, judgeHealthy } from '../../tools/watch/judge.js';
import { faultTable, watchBlocks } from '../../tools/watch/report.js';
import type { Believed, Told, WatchRun } from '../../tools/watch/watchRun.js';
import { watchedUnit } from '../../tools/watch/watchUnit.js';
import { WEEKS_D, weekSegments, weekWeather } from '../../tools/watch/weeks.js';

const branch = (id: string): Branch => BRANCHES.find((one) => one.id === id) as Branch;
const told = (t_h: number, kind: Told['kind'], subject: string): Told => {
  const own = { transition: 'raised', value: null, message: '' } as const;
  return { t_h, kind, class: KIND_CLASSES[kind].class, subject, ...own };
};
type Cause = NonNullable<Believed['cause']>;
const held = (t_h: number, cause: Cause['cause'], subject: string): Believed => ({
  t_h,
  cause: { cause, subject, probability: 0.9 },
});
const run = (events: Told[], causes: Believed[] = [], hours = 24): WatchRun => {
  return { hours, events, causes, views: [], cpu_s: 0 };
};

describe('a fault of the watch', () => {
  const SEED = 4;
  const { store } = lotOf(SEED, 'transfer-16');
  const other = store === 'hot' ? 'cold' : 'hot';
  const of = (events: Told[], causes: Believed[] = []) =>
    judge(branch('transfer-16'), SEED, run(events, causes));

  it('is right only where it is found in time, in its store, and held for its cause in the end', () => {
    const found = told(5, 'heat_transfer_low', store);
    const right = held(6, 'dust_or_fines', store);
    expect(of([found], [right])).toMatchObject({
      outcome: 'right',
      delay_h: 5,
      rightAtOnce: false,
    });
    expect(of([found], [held(5, 'dust_or_fines', store)]).rightAtOnce).toBe(true);
    expect(of([found], [right, held(20, 'flow_meter', 'flow')])).toMatchObject({
      outcome: 'wrong_cause',
      cause: 'flow_meter',
    });
    expect(of([found], [held(6, 'dust_or_fines', other)]).outcome).toBe('wrong_cause');
    expect(of([found], [right, { t_h: 9, cause: null }]).outcome).toBe('no_cause');
    expect(of([told(24.5, 'heat_transfer_low', store)], [right]).outcome).toBe('late');
    expect(of([told(5, 'heat_transfer_low', other)], [right]).outcome).toBe('missed');
    expect(of([{ ...found, transition: 'returned' }], [right]).outcome).toBe('missed');
  });

  it('counts what else degrades, but neither what follows from it nor sensors', () => {
    const events = [
      told(5, 'heat_transfer_low', store),
      told(6, 'front_spread', store),
      told(7, 'energy_lost', 'vellmoor'),
      told(8, 'sensor_rejected', `${store}_axis_01`),
      told(9, 'front_travel_off', store),
      told(10, 'front_travel_off', store),
      told(11, 'front_spread', other),
    ];
    expect(of(events).others).toEqual([`front_travel_off ${store}`, `front_spread ${other}`]);
  });

  it('tells a string or a thermocouple of a store from the store beside it', () => {
    expect(['hot', 'hot/axis', 'hot_axis_01', 'hotter', 'cold'].map((s) => isOf(s, 'hot'))).toEqual(
      [true, true, true, false, false],
    );
  });

  it('stands in the table with its strongest grade and what it was taken for', () => {
    const right = of([told(5, 'heat_transfer_low', store)], [held(6, 'dust_or_fines', store)]);
    const wrong = of([told(7, 'front_spread', store)], [held(8, 'settled_bed', store)]);
    const judged = new Map([['transfer-16', [right, wrong]]]);
    const text = faultTable(judged);
    expect(text).toMatch(/heat transfer at 16 % \* +2 +1 +1 +0 +0 +0 +0 +7\.0 +7\.0 +0/);
    expect(text).toContain(`transfer-16 seed ${SEED}: wrong_cause settled_bed`);
    const figures = watchBlocks(judged, [])[0]?.figures;
    expect(figures).toEqual([expect.objectContaining({ value: 1, target: '>= 2', met: false })]);
  });
});

describe('healthy days of the watch', () => {
  it('ask for no degradation alert and for an alarm a day at most', () => {
    const raised = [
      told(1, 'outlet_near_limit', 'cold'),
      told(2, 'front_spread', 'hot'),
      told(3, 'sensor_rejected', 'hot_axis_01'),
    ];
    const one = judgeHealthy(7, new Map([['weeks', run(raised, [], 48)]]));
    expect(one).toMatchObject({ days: 2, alarms: 1 });
    expect(one.degradation.map((e) => e.kind)).toEqual(['front_spread']);
    expect(one.other.map((e) => e.kind)).toEqual(['sensor_rejected']);
    const figures = watchBlocks(new Map(), [one])[0]?.figures ?? [];
    const by = (name: string) => figures.find((f) => f.name === name);
    expect(by('degradation alerts')).toMatchObject({
      value: 1,
      met: false,
      note: 'front_spread 1',
    });
    expect(by('annunciated alarms')).toMatchObject({ value: 0.5, met: true });
    expect(by('unit-days')?.met).toBeNull();
  });

  it('last as long as they say, within the powers of the plant, and end with the weather back in bounds', () => {
    for (const seed of [1, 2, 3]) {
      const segments = weekSegments(seed);
      expect(segments.reduce((sum, s) => sum + s.duration_s, 0)).toBe(WEEKS_D * 86_400);
      const powers = segments.flatMap((s) => (s.power_W === undefined ? [] : [s.power_W]));
      expect(Math.max(...powers)).toBeLessThanOrEqual(1.5 * GEOMETRY.rated_power_W);
      expect(Math.min(...powers)).toBeGreaterThanOrEqual(0.3 * GEOMETRY.rated_power_W);
      expect(new Set(segments.map((s) => s.mode)).size).toBe(3);
      let sum = 0;
      for (const turn of weekWeather(seed)) {
        if (turn.kind !== 'weather') throw new Error(turn.kind);
        sum += turn.offset_K;
        expect(Math.abs(sum)).toBeLessThanOrEqual(8);
      }
    }
  });
});

describe('the branches of the watch', () => {
  it('last as long as there is to find them, and each is expected by alerts that tell of degradation', () => {
    expect(new Set(BRANCHES.map((one) => one.id)).size).toBe(13);
    for (const one of BRANCHES) {
      const hours = branchSegments(one, 1).reduce((sum, s) => sum + s.duration_s / 3600, 0);
      expect(hours).toBeGreaterThanOrEqual(one.window_h);
      for (const kind of expectedOf(one.id).kinds) expect(DEGRADATION.has(kind)).toBe(true);
      const changes = changesOf(one, 1, 3600);
      expect(changes.length).toBe(one.fault === undefined ? 1 : 0);
      for (const change of changes) expect(change.at_s).toBe(3600);
    }
    // All grades of one fault sit in the same place of a seed; seeds differ.
    expect(lotOf(1, 'transfer-70')).toEqual(lotOf(1, 'transfer-16'));
    expect(new Set([1, 2, 3, 4, 5, 6].map((seed) => lotOf(seed, 'leak-0.5').store)).size).toBe(2);
    expect(() => expectedOf('rust-3')).toThrow(RangeError);
  });

  it('are read by a unit whose channels are all in the plant, those near the top included', () => {
    const there = new Set([
      ...GEOMETRY.channels.map((c) => c.id),
      ...GEOMETRY.stores.flatMap((s) =>
        s.strings.flatMap((t) => t.thermocouples.map((c) => `${c.id} ${c.position_m.toFixed(3)}`)),
      ),
    ]);
    for (const [kind, count] of [
      ['demo', 14],
      ['top', 15],
    ] as const) {
      const unit = watchedUnit(kind);
      for (const string of unit.stores.flatMap((s) => s.strings)) {
        expect(string.thermocouples.length).toBe(count);
        for (const t of string.thermocouples)
          expect(there).toContain(`${t.id} ${t.position_m.toFixed(3)}`);
      }
      expect(unit.scan_period_s).toBe(GEOMETRY.scan_period_s);
    }
  });
});
