import type { CycleRecord } from '../watch/cycleRecord.js';

/** What a span of runs adds up to. Sums leave out what was not known, and `unknown` counts it. */
export interface CycleTotals {
  readonly charges: number;
  readonly discharges: number;
  readonly stands: number;
  readonly incomplete: number;
  readonly drawn_MWh_el: number;
  readonly delivered_MWh_el: number;
  /** Of runs whose power was not read. */
  readonly unknown: number;
  /** Median of the round trips that closed, and how many did; null without any. */
  readonly round_trip: number | null;
  readonly round_trips: number;
  /** Heat lost while standing, by store [MWh_th]; its time [h]. */
  readonly standing_lost_MWh_th: Readonly<Record<string, number>>;
  readonly standing_h: number;
}

/** Sums over records of one unit. */
export function cycleTotals(cycles: readonly CycleRecord[]): CycleTotals {
  const lost: Record<string, number> = {};
  let standing_h = 0;
  for (const cycle of cycles) {
    if (cycle.kind !== 'stand') continue;
    standing_h += hoursOf(cycle);
    for (const [id, { lost_MWh_th }] of Object.entries(cycle.stores))
      if (lost_MWh_th !== null) lost[id] = (lost[id] ?? 0) + lost_MWh_th;
  }
  const count = (kind: CycleRecord['kind']) => cycles.filter((c) => c.kind === kind).length;
  const sum = (values: readonly (number | null)[]) =>
    values.reduce<number>((total, value) => total + (value ?? 0), 0);
  const trips = cycles.flatMap(({ round_trip }) => (round_trip === null ? [] : [round_trip]));
  return {
    charges: count('charge'),
    discharges: count('discharge'),
    stands: count('stand'),
    incomplete: cycles.filter(({ incomplete }) => incomplete.length > 0).length,
    drawn_MWh_el: sum(cycles.map((c) => c.drawn_MWh_el)),
    delivered_MWh_el: sum(cycles.map((c) => c.delivered_MWh_el)),
    unknown: cycles.filter((c) => c.drawn_MWh_el === null || c.delivered_MWh_el === null).length,
    round_trip: median(trips),
    round_trips: trips.length,
    standing_lost_MWh_th: lost,
    standing_h,
  };
}

/** Length of a run [h]. */
export function hoursOf({ from, to }: Pick<CycleRecord, 'from' | 'to'>): number {
  return (Date.parse(to) - Date.parse(from)) / 3_600_000;
}

/** Middle of the sorted values, the mean of both middles where they are even in number; null of none. */
export function median(values: readonly number[]): number | null {
  if (values.length === 0) return null;
  const sorted = [...values].sort((a, b) => a - b);
  const middle = sorted.length >> 1;
  return sorted.length % 2 === 1
    ? (sorted[middle] as number)
    : ((sorted[middle - 1] as number) + (sorted[middle] as number)) / 2;
}
