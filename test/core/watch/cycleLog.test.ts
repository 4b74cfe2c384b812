import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { Mode } from '../../../src/core/definitions.js';
import type { CycleScan } from '../../../src/core/watch/cycle/cycleScan.js';
import { startCycleLog } from '../../../src/core/watch/cycleLog.js';
import type { CycleRecord } from '../../../src/core/watch/cycleRecord.js';
import {
  CAPACITY_MWh,
  HEAT_PER_DRAWN,
  HEAT_PER_GIVEN,
  LENGTH_M,
  type Part,
  run,
  script,
  unread,
} from './cycleScript.js';

const kinds = (records: readonly CycleRecord[]) => records.map(({ kind }) => kind);
const scansAt = (record: CycleRecord, scans: readonly CycleScan[]) =>
  (Date.parse(record.from) - scans[0]!.time_ms) / 60_000;

describe('runs told apart', () => {
  it('one by one, each from half-way between the scans about its edge', () => {
    const scans = script([
      { mode: 'charge', scans: 300 },
      { mode: 'stand', scans: 60 },
      { mode: 'discharge', scans: 120 },
      { mode: 'charge', scans: 60 },
    ]);
    const { records, state } = run(scans);
    expect(kinds(records)).toEqual(['charge', 'stand', 'discharge']);
    expect(records.map((record) => scansAt(record, scans))).toEqual([0, 299.5, 359.5]);
    expect(records.map(({ no }) => no)).toEqual([1, 2, 3]);
    expect(records.map(({ incomplete }) => incomplete)).toEqual([['began_before'], [], []]);
    expect(records.map(({ to }) => to).slice(0, 2)).toEqual(
      records.map(({ from }) => from).slice(1),
    );
    expect(state.mode).toBe('charge');
    expect(records[1]!.running_h).toBeCloseTo(1, 9);
  });

  it('not by a pause below ten minutes, nor by part loads, ramps or a flicker of either kind', () => {
    const scans = script([
      { mode: 'charge', scans: 60 },
      { mode: 'stand', scans: 8 },
      { mode: 'charge', scans: 30, power_MW: 0.4 },
      { mode: 'discharge', scans: 2 },
      { mode: 'charge', scans: 30, power_MW: 3 },
      { mode: 'stand', scans: 120 },
      { mode: 'charge', scans: 2 },
      { mode: 'stand', scans: 60 },
      { mode: 'discharge', scans: 5 },
    ]);
    const { records } = run(scans);
    expect(kinds(records)).toEqual(['charge', 'stand']);
    expect(records[0]!.running_h).toBeCloseTo((60 + 30 + 30 - 0.5) / 60, 1);
    expect(Date.parse(records[1]!.from) - scans[0]!.time_ms).toBe(129.5 * 60_000);
  });

  it('a change-over: the time between two directions belongs to the run that follows', () => {
    const scans = script([
      { mode: 'charge', scans: 60 },
      { mode: 'stand', scans: 6 },
      { mode: 'discharge', scans: 60 },
      { mode: 'stand', scans: 30 },
    ]);
    const { records } = run(scans);
    expect(kinds(records)).toEqual(['charge', 'discharge']);
    expect(scansAt(records[1]!, scans)).toBe(59.5);
    expect(records[1]!.running_h).toBeCloseTo(1, 9);
    expect(records[1]!.stores.hot!.outlet_from_K).toBeCloseTo(scans[66]!.stores[0]!.outlet_K!, 9);
  });

  it('a direction that lasts is one of its own, however short the run before', () => {
    const short: Part[] = [
      { mode: 'stand', scans: 60 },
      { mode: 'charge', scans: 4 },
      { mode: 'discharge', scans: 4 },
      { mode: 'stand', scans: 20 },
    ];
    expect(kinds(run(script(short)).records)).toEqual(['stand', 'charge', 'discharge']);
  });

  it('scans that tell no mode are no evidence, nor is one scan after a hole enough', () => {
    const scans = script(
      [
        { mode: 'charge', scans: 60 },
        { mode: 'stand', scans: 40 },
      ],
      { change: (scan, i) => (i >= 60 && i < 99 ? { ...scan, modeRead: false } : scan) },
    );
    expect(run(scans).records).toEqual([]);
    const hole = scans.filter((_, i) => i < 60 || i === 99);
    expect(run(hole).records).toEqual([]);
  });
});

describe('what a record holds', () => {
  const scans = script([
    { mode: 'stand', scans: 30 },
    { mode: 'charge', scans: 400 },
    { mode: 'stand', scans: 60 },
    { mode: 'discharge', scans: 250 },
    { mode: 'stand', scans: 30 },
  ]);
  const { records } = run(scans);
  const charge = records[1]!;
  const discharge = records[3]!;

  it('electricity, heat and what was lost, per store', () => {
    expect(kinds(records)).toEqual(['stand', 'charge', 'stand', 'discharge']);
    expect(charge.drawn_MWh_el).toBeCloseTo((2 * 400) / 60, 3);
    expect(charge.delivered_MWh_el).toBe(0);
    expect(discharge.delivered_MWh_el).toBeCloseTo((2 * 250) / 60, 3);
    expect(charge.power_most_MW_el).toBe(2);
    expect(charge.flow_mean_kg_s).toBeCloseTo(20, 9);
    const hot = charge.stores.hot!;
    expect(hot.carried_MWh_th).toBeCloseTo(charge.drawn_MWh_el! * HEAT_PER_DRAWN, 1);
    // The script moves heat within the scan before, the log counts from half-way: half a scan's heat.
    const half = (2 * HEAT_PER_DRAWN) / 60 / 2;
    expect(hot.lost_MWh_th).toBeCloseTo(half, 6);
    expect(hot.stored_to_MWh_th - hot.stored_from_MWh_th).toBeCloseTo(20 - half, 6);
    expect(discharge.stores.cold!.carried_MWh_th).toBeCloseTo((-2 * 250 * HEAT_PER_GIVEN) / 60, 3);
    expect(records[2]!.stores.hot!.carried_MWh_th).toBeNull();
    expect(records[2]!.flow_mean_kg_s).toBeNull();
    expect(charge.ambient_mean_K).toBeCloseTo(290, 9);
  });

  it('widths and spread ratio at the same three places, either way', () => {
    for (const [record, places] of [
      [charge, [0.25, 0.5, 0.75]],
      [discharge, [0.25, 0.5, 0.75]],
    ] as const) {
      const { widths } = record.stores.hot!;
      expect(widths.map(({ place_m }) => place_m)).toEqual(places.map((at) => at * LENGTH_M));
      for (const { share, width_m, spread_ratio } of widths) {
        // A scan moves by 2 MW 1.5/60/20 MWh = 0.25 %, at discharge 0.4 %: half of it off.
        expect(Math.abs(width_m! - (0.5 + share))).toBeLessThan(0.0021);
        expect(Math.abs(spread_ratio! - (1 + share / 10))).toBeLessThan(0.00021);
      }
    }
    expect(records[2]!.stores.hot!.widths).toEqual([]);
  });

  it('extremes, outlets and alarms of the run alone', () => {
    const noted = scans.map((scan, i) =>
      i === 200 ? { ...scan, raised: ['u/k/s', 'u/k/s'] } : scan,
    );
    const found = run(noted).records;
    expect(found.map(({ raised }) => raised)).toEqual([[], ['u/k/s'], [], []]);
    const socs = scans.slice(30, 430).map(({ soc }) => soc);
    expect(found[1]!.stores.hot!.hottest_K).toBeCloseTo(700 + Math.max(...socs), 9);
    expect(found[1]!.stores.hot!.coldest_K).toBeCloseTo(300 - Math.max(...socs), 9);
    expect(found[1]!.stores.hot!.outlet_to_K).toBeCloseTo(300 + 100 * socs.at(-1)!, 9);
    expect(found[2]!.stores.hot!.outlet_to_K).toBeNull();
  });

  it('what was told of the end of a discharge, not what was told anew, with a flicker in between', () => {
    const at = scans.findIndex(({ mode }) => mode === 'discharge');
    const told = (made_ms: number, power_W: number) => ({
      ...{ made_ms, power_W, end_ms: made_ms + 3_600_000, firm_ms: made_ms + 3_000_000 },
    });
    const begin = scans[at]!.time_ms + 120_000;
    const noted = scans.map((scan, i) => {
      // A flicker of the mode forgets the run; the next telling is another.
      if (scan.mode !== 'discharge' || i < at + 3) return scan;
      if (i === at + 60) return { ...scan, mode: 'stand' as const };
      if (i > at + 60) return { ...scan, told: told(scan.time_ms, 9e6) };
      return { ...scan, told: told(begin, i < at + 30 ? 2e6 : 1.5e6) };
    });
    const found = run(noted).records;
    expect(found.map(({ kind }) => kind)).toEqual(run(scans).records.map(({ kind }) => kind));
    const iso = (ms: number) => new Date(ms).toISOString();
    for (const { kind, told } of found) {
      if (kind !== 'discharge') expect(told).toBeNull();
    }
    expect(found.find(({ kind }) => kind === 'discharge')!.told).toEqual({
      made: iso(begin),
      power_MW_el: 1.5,
      end: iso(begin + 3_600_000),
      firm_end: iso(begin + 3_000_000),
    });
  });

  it('takes no learned heat capacity for heat that was lost', () => {
    const learned = scans.map((scan, i) => ({
      ...scan,
      stores: scan.stores.map((store) => ({
        ...store,
        capacity_MWh_th: CAPACITY_MWh * (1 + Math.min(i, 460) / 10_000),
      })),
    }));
    const stand = run(learned).records[2]!.stores.hot!;
    // The last edge lies half-way down the first scan of the discharge; 0.7 MWh were learned meanwhile.
    const half = (2 * HEAT_PER_GIVEN) / 60 / 2;
    const change = stand.stored_to_MWh_th - stand.stored_from_MWh_th;
    expect(Math.abs(change + half)).toBeLessThan(0.05 * half);
  });
});

describe('what is missing', () => {
  const parts: Part[] = [
    { mode: 'stand', scans: 30 },
    { mode: 'charge', scans: 200 },
    { mode: 'stand', scans: 60 },
  ];
  const charge = (change: (scan: CycleScan, i: number) => CycleScan) =>
    run(script(parts, { change })).records[1]!;

  it('a few scans leave a run complete, power held; more than five mark it', () => {
    const five = charge((scan, i) => (i >= 100 && i < 104 ? unread(scan) : scan));
    expect(five.incomplete).toEqual([]);
    expect(five.drawn_MWh_el).toBeCloseTo((2 * 200) / 60, 3);
    const six = charge((scan, i) => (i >= 100 && i < 120 ? unread(scan) : scan));
    expect(six.incomplete).toEqual(['gap', 'power_unknown']);
    // Of the six intervals until it is too long half is known, of the last one half again.
    expect(six.drawn_MWh_el).toBeCloseTo((2 * (200 - 21 + 3 + 0.5)) / 60, 3);
  });

  it('a gap in the midst does not split; a mode that changed within it ends the run after it', () => {
    const scans = script([...parts, { mode: 'discharge', scans: 20 }], {
      change: (scan, i) => (i >= 100 && i < 130 ? unread(scan) : scan),
    });
    const { records } = run(scans);
    expect(kinds(records)).toEqual(['stand', 'charge', 'stand']);
    expect(records.map(({ incomplete }) => incomplete)).toEqual([
      ['began_before'],
      ['gap', 'power_unknown'],
      [],
    ]);
  });

  it('thermocouples alone, flow alone, power alone', () => {
    const some = (i: number) => i >= 100 && i < 120;
    expect(charge((scan, i) => (some(i) ? { ...scan, bedRead: false } : scan)).incomplete).toEqual([
      'gap',
    ]);
    const flow = charge((scan, i) => (some(i) ? { ...scan, flowKnown: false } : scan));
    expect(flow.incomplete).toEqual(['flow_unknown']);
    const without = charge((scan) => ({ ...scan, power_MW: Number.NaN }));
    expect(without.incomplete).toEqual(['power_unknown']);
    expect(without.drawn_MWh_el).toBeNull();
    expect(without.power_most_MW_el).toBeNull();
    expect(without.stores.hot!.carried_MWh_th).not.toBeNull();
  });

  it('a day without a reading ends what was under way at its last reading, and the log begins anew', () => {
    const scans = script(parts);
    const later = script(
      [
        { mode: 'discharge', scans: 200 },
        { mode: 'stand', scans: 20 },
      ],
      {
        change: (scan) => ({ ...scan, time_ms: scan.time_ms + 3 * 86_400_000 }),
      },
    );
    const { records } = run([...scans.slice(0, 150), ...later]);
    expect(kinds(records)).toEqual(['stand', 'charge', 'discharge']);
    expect(records[1]).toMatchObject({ to: new Date(scans[149]!.time_ms).toISOString() });
    expect(records[1]!.incomplete).toEqual(['gap']);
    expect(records[2]!.incomplete).toEqual(['began_before']);
    expect(records[2]!.from).toBe(new Date(later[0]!.time_ms).toISOString());
  });

  it('says nothing before every store has started, and refuses a scan that is not later', () => {
    const scans = script(parts);
    const blind = scans.slice(0, 20).map((scan) => ({ ...scan, stores: [] }));
    const { state } = run(blind);
    expect(state.open).toBeNull();
    const { state: started } = run(scans.slice(20, 40), 60, state);
    expect(() => run([scans[39]!], 60, started)).toThrow(RangeError);
  });
});

/** A schedule in which every stand is longer and every pause shorter than what splits a run. */
const schedule = fc
  .array(
    fc.record({
      mode: fc.constantFrom<Mode>('charge', 'discharge', 'stand'),
      minutes: fc.integer({ min: 40, max: 200 }),
      loads: fc.array(fc.double({ min: 0.3, max: 2, noNaN: true }), { minLength: 1, maxLength: 3 }),
      pause: fc.integer({ min: 0, max: 6 }),
    }),
    { minLength: 2, maxLength: 7 },
  )
  .map((runs) => runs.filter(({ mode }, i) => i === 0 || mode !== runs[i - 1]!.mode));

describe('random schedules with noise, flicker, pauses, part loads, holes and restarts', () => {
  it('the same runs, edges within a few scans, energies the integral, states equal to the bit', () => {
    fc.assert(
      fc.property(
        schedule,
        fc.constantFrom(30, 60),
        fc.integer({ min: 0, max: 2 ** 30 }),
        fc.double({ min: 0, max: 1, noNaN: true }),
        (runs, scan_period_s, seed, at) => {
          let chance = seed;
          const draw = () => {
            chance = (Math.imul(chance, 1_103_515_245) + 12_345) & 0x7fffffff;
            return chance / 2 ** 31;
          };
          const per_min = 60 / scan_period_s;
          const parts = runs.flatMap(({ mode, minutes, loads, pause }): Part[] => {
            const own = loads.map((power_MW) => ({
              mode,
              scans: Math.ceil((minutes * per_min) / loads.length),
              ...(mode === 'stand' ? {} : { power_MW }),
            }));
            return mode === 'stand' || pause === 0
              ? own
              : [own[0]!, { mode: 'stand', scans: pause * per_min }, ...own];
          });
          let flicker: Mode | null = null;
          let missing = 0;
          const scans = script(parts, {
            scan_period_s,
            change: (scan, i) => {
              flicker = draw() < 0.02 ? (['charge', 'stand', 'discharge'] as const)[i % 3]! : null;
              missing = missing > 0 ? missing - 1 : draw() < 0.01 ? 1 + Math.floor(3 * draw()) : 0;
              const noisy = { ...scan, power_MW: scan.power_MW + 0.02 * (draw() - 0.5) };
              return missing > 0 && i > 0
                ? unread(noisy)
                : { ...noisy, mode: flicker ?? scan.mode };
            },
          });
          const end = scans.at(-1)!;
          // Enough of a stand, or of a run after it, that the last of the schedule is over.
          const last: Mode = runs.at(-1)!.mode === 'stand' ? 'charge' : 'stand';
          const tail = script([{ mode: last, scans: 25 * per_min }], {
            scan_period_s,
            change: (scan) => ({ ...scan, time_ms: scan.time_ms - START_OF_SCRIPT + end.time_ms }),
          });
          const all = [...scans, ...tail];
          const whole = run(all, scan_period_s);
          expect(kinds(whole.records)).toEqual(runs.map(({ mode }) => mode));
          checkEdges(whole.records, runs, parts, all[0]!.time_ms, scan_period_s);
          checkEnergies(whole, all);

          const cut = Math.floor(at * all.length);
          const before = run(all.slice(0, cut), scan_period_s);
          const after = run(all.slice(cut), scan_period_s, structuredClone(before.state));
          expect([...before.records, ...after.records]).toEqual(whole.records);
          expect(after.state).toEqual(whole.state);
        },
      ),
      { numRuns: 25 },
    );
  });

  it('stays bounded however many cycles there are', () => {
    const state = startCycleLog();
    const day: Part[] = [
      { mode: 'charge', scans: 60 },
      { mode: 'stand', scans: 20 },
      { mode: 'discharge', scans: 37 },
      { mode: 'stand', scans: 20 },
    ];
    const sizes = [24, 30].map((many) => {
      const scans = script(Array.from({ length: many }, () => day).flat());
      const shifted = scans.map((scan) => ({
        ...scan,
        time_ms: scan.time_ms + (state.last === null ? 0 : state.last.time_ms - START_OF_SCRIPT),
      }));
      run(shifted, 60, state);
      return JSON.stringify(state).length;
    });
    expect(sizes[1]!).toBeLessThan(1.1 * sizes[0]!);
    expect(sizes[1]!).toBeLessThan(60_000);
  });
});

const START_OF_SCRIPT = Date.UTC(2026, 4, 1);

/** Each edge within six scans of the schedule's: flicker beside it, or scans that are missing. */
function checkEdges(
  records: readonly CycleRecord[],
  runs: readonly { mode: Mode }[],
  parts: readonly Part[],
  begin_ms: number,
  scan_period_s: number,
): void {
  let scan = 0;
  const edges: number[] = [];
  let current: Mode | null = null;
  for (const part of parts) {
    const own = part.mode;
    const isPause = own === 'stand' && current !== 'stand' && part.scans * scan_period_s < 600;
    if (!isPause && own !== current) {
      edges.push(scan);
      current = own;
    }
    scan += part.scans;
  }
  expect(edges).toHaveLength(runs.length);
  records.forEach((record, i) => {
    const found = (Date.parse(record.from) - begin_ms) / 1000 / scan_period_s;
    expect(Math.abs(found - edges[i]!)).toBeLessThanOrEqual(6.5);
  });
  for (let i = 1; i < records.length; i++) expect(records[i]!.from).toBe(records[i - 1]!.to);
}

/** Records and what is under way together: the trapezoids of the power between the scans that were read. */
function checkEnergies({ records, state }: ReturnType<typeof run>, scans: readonly CycleScan[]) {
  let drawn = 0;
  let delivered = 0;
  const read = scans.filter(({ power_MW }) => Number.isFinite(power_MW));
  for (let i = 1; i < read.length; i++) {
    const hours = (read[i]!.time_ms - read[i - 1]!.time_ms) / 3.6e6;
    for (const power of [read[i]!.power_MW, read[i - 1]!.power_MW]) {
      drawn += (Math.max(0, power) * hours) / 2;
      delivered += (Math.max(0, -power) * hours) / 2;
    }
  }
  const open = [state.open, state.beside].flatMap((one) => one ?? []);
  const sum = (of_records: number[], rest: number[]) =>
    [...of_records, ...rest].reduce((total, one) => total + one, 0);
  const foundDrawn = sum(
    records.map(({ drawn_MWh_el }) => drawn_MWh_el!),
    open.map(({ drawn_MWh }) => drawn_MWh),
  );
  const foundDelivered = sum(
    records.map(({ delivered_MWh_el }) => delivered_MWh_el!),
    open.map(({ delivered_MWh }) => delivered_MWh),
  );
  expect(foundDrawn).toBeCloseTo(drawn, 9);
  expect(foundDelivered).toBeCloseTo(delivered, 9);
}
