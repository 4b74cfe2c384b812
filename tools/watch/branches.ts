import { DEMO_GEOMETRY } from '../../test/plant/demoGeometry.js';
import type { PlantChange, SensorFault } from '../../test/plant/faults.js';
import { type PlantGeometry, withTopThermocouples } from '../../test/plant/geometry.js';
import { RandomStream } from '../../test/plant/random.js';
import { SCHEDULES } from '../../test/plant/schedules.js';
import type { Segment } from '../../test/plant/truth.js';

export const SCAN_S = 60;
const H = 3600;
const P = DEMO_GEOMETRY.rated_power_W;

/** The demonstration's plant, with thermocouples just below the top that only some units read. */
export const GEOMETRY: PlantGeometry = withTopThermocouples(
  { ...DEMO_GEOMETRY, scan_period_s: SCAN_S },
  0.1,
);

/**
 * What a seed's truth consists of: a healthy lead; from its end the way on to a second stand, healthy;
 * and faults, each of which sets in at the end of one of the two.
 */
export type Onset = 'lead' | 'way';
export const ONSETS: readonly Onset[] = ['lead', 'way'];

/** Where faults of a seed sit, by lot. */
export interface Lot {
  readonly store: 'hot' | 'cold';
  readonly string: 'axis' | 'middle' | 'rim';
  /** Direction of a leak: with the charge or against it. */
  readonly sign: 1 | -1;
}

export function lotOf(seed: number, branch: string): Lot {
  const random = new RandomStream(seed, `watch ${branch.replace(/-.*/, '')}`);
  return {
    store: random.uniform() < 0.5 ? 'hot' : 'cold',
    string: (['axis', 'middle', 'rim'] as const)[Math.floor(random.uniform(0, 3))] as Lot['string'],
    sign: random.uniform() < 0.5 ? 1 : -1,
  };
}

export interface Branch {
  readonly id: string;
  readonly words: string;
  readonly onset: Onset;
  /** Longest time to find it in [h]: a cycle, or a stand. */
  readonly window_h: number;
  /** Thermocouples that are read: the demonstration's, or those near the top besides. */
  readonly unit: UnitKind;
  readonly change?: (lot: Lot) => StoreFault;
  readonly fault?: (at_s: number) => SensorFault;
}

export type UnitKind = 'demo' | 'top';
type StoreFault = { readonly store: string } & (
  | { readonly kind: 'heat_transfer' | 'insulation'; readonly factor: number }
  | { readonly kind: 'pressure_drop'; readonly factor: number; readonly below_K?: number }
  | { readonly kind: 'channelling'; readonly string: string; readonly factor: number }
  | { readonly kind: 'leak'; readonly share: number }
  | { readonly kind: 'settled'; readonly depth_m: number }
  | { readonly kind: 'gas_loss'; readonly share: number }
);

const CYCLE_H = 24;
const STAND_H = 36;

const cycling = (
  id: string,
  words: string,
  change: (lot: Lot) => StoreFault,
  unit: UnitKind = 'demo',
): Branch => ({ id, words, onset: 'lead', window_h: CYCLE_H, unit, change });

/** Faults by grade, the strongest of a kind last. */
export const BRANCHES: readonly Branch[] = [
  ...[70, 50, 30, 16].map((percent) =>
    cycling(`transfer-${percent}`, `heat transfer at ${percent} %`, ({ store }) => ({
      kind: 'heat_transfer',
      store,
      factor: percent / 100,
    })),
  ),
  ...[5, 10, 22].map((percent) =>
    cycling(`channel-${percent}`, `channelling of ${percent} %`, ({ store, string }) => ({
      kind: 'channelling',
      store,
      string,
      factor: 1 + percent / 100,
    })),
  ),
  {
    id: 'meter-7',
    words: 'flow meter -7 %',
    onset: 'lead',
    window_h: CYCLE_H,
    unit: 'demo',
    fault: (at_s) => ({ kind: 'meter_step', at_s, factor: 0.93 }),
  },
  ...[1.2, 1.5].map((factor) =>
    cycling(`drop-${factor}`, `pressure drop times ${factor}`, ({ store }) => ({
      kind: 'pressure_drop',
      store,
      factor,
    })),
  ),
  cycling(
    'settled-150',
    'bed sunk by 150 mm',
    ({ store }) => ({ kind: 'settled', store, depth_m: 0.15 }),
    'top',
  ),
  {
    id: 'insulation-2',
    words: 'insulation at twice its loss',
    onset: 'way',
    window_h: STAND_H,
    unit: 'demo',
    change: ({ store }) => ({ kind: 'insulation', store, factor: 2 }),
  },
  {
    id: 'leak-0.5',
    words: 'leak of 0.5 % while standing',
    onset: 'way',
    window_h: STAND_H,
    unit: 'demo',
    change: ({ store, sign }) => ({ kind: 'leak', store, share: sign * 0.005 }),
  },
];

/** Whether no stronger grade of the same fault follows. */
export function strongest(branch: Branch): boolean {
  const kind = (id: string) => id.replace(/-.*/, '');
  const same = BRANCHES.filter((one) => kind(one.id) === kind(branch.id));
  return same.at(-1) === branch;
}

/** The way on without a fault: what the faults are held against. */
export const HEALTHY: Branch = {
  id: 'healthy',
  words: 'no fault',
  onset: 'way',
  window_h: STAND_H,
  unit: 'demo',
};

/** What changes in the plant and its meters at an onset. */
export function changesOf(branch: Branch, seed: number, at_s: number): PlantChange[] {
  const change = branch.change?.(lotOf(seed, branch.id));
  return change === undefined ? [] : [{ ...change, at_s } as PlantChange];
}

export const faultsOf = (branch: Branch, at_s: number): SensorFault[] =>
  branch.fault === undefined ? [] : [branch.fault(at_s)];

/** A power about `share` of the rated one, by lot. */
function around(random: RandomStream, share: number): number {
  return share * P * random.uniform(0.93, 1.07);
}

/** A day of full cycle and part loads, a charge and 36 h of rest. */
export function leadSegments(seed: number): Segment[] {
  const random = new RandomStream(seed, 'watch lead');
  const day = (SCHEDULES.day as NonNullable<typeof SCHEDULES.day>)(GEOMETRY);
  return [
    ...day.map((one) =>
      one.power_W === undefined ? one : { ...one, power_W: around(random, one.power_W / P) },
    ),
    { mode: 'charge', power_W: around(random, 1.4), duration_s: 5.5 * H },
    { mode: 'stand', duration_s: STAND_H * H },
  ];
}

/** From the end of the lead to the second stand. */
export function waySegments(seed: number): Segment[] {
  const random = new RandomStream(seed, 'watch way');
  return [
    { mode: 'discharge', power_W: around(random, 1), duration_s: 4 * H },
    { mode: 'stand', duration_s: 0.5 * H },
    { mode: 'charge', power_W: around(random, 1.5), duration_s: 6 * H },
  ];
}

/** What the unit does once the fault is there: a cycle and more, or a stand and what shows it after. */
export function branchSegments(branch: Branch, seed: number): Segment[] {
  const random = new RandomStream(seed, 'watch branch');
  if (branch.onset === 'way') {
    return [
      { mode: 'stand', duration_s: STAND_H * H },
      { mode: 'discharge', power_W: around(random, 1), duration_s: 2 * H },
    ];
  }
  return [
    ...waySegments(seed),
    { mode: 'stand', duration_s: 1.5 * H },
    { mode: 'discharge', power_W: around(random, 0.7), duration_s: 4.5 * H },
    { mode: 'stand', duration_s: 0.5 * H },
    { mode: 'charge', power_W: around(random, 1.2), duration_s: 5 * H },
    { mode: 'stand', duration_s: 2 * H },
  ];
}
