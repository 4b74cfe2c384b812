/** One figure of the table. */
export interface Figure {
  readonly name: string;
  readonly value: number | null;
  readonly unit: string;
  /** What the goal is, in words; null where there is none. */
  readonly target: string | null;
  readonly met: boolean | null;
  /** The goal holds for each single run, not only for many together. */
  readonly each: boolean;
  readonly note: string;
}

/** Bounds that a figure is to keep. */
export interface Goal {
  readonly least?: number;
  readonly most?: number;
  readonly each?: boolean;
}

/** A figure with its goal, if it has one; a figure that could not be had misses it. */
export function figure(
  name: string,
  value: number | null,
  unit: string,
  goal: Goal | null = null,
  note: string | undefined = '',
): Figure {
  if (goal === null) return { name, value, unit, target: null, met: null, each: false, note };
  const { least, most } = goal;
  const target =
    least === undefined ? `<= ${most}` : most === undefined ? `>= ${least}` : `${least}..${most}`;
  const met =
    value !== null &&
    value <= (most ?? Number.POSITIVE_INFINITY) &&
    value >= (least ?? Number.NEGATIVE_INFINITY);
  return { name, value, unit, target, met, each: goal.each ?? false, note };
}

/** Numbers of one name that the runs left behind, without those that have none. */
export function ownValues(
  results: readonly { readonly own: Readonly<Record<string, number | null>> }[],
  name: string,
): number[] {
  return results.flatMap((r) => {
    const value = r.own[name];
    return value === undefined || value === null ? [] : [value];
  });
}

export const rms = (values: readonly number[]): number | null =>
  values.length === 0 ? null : Math.sqrt(values.reduce((sum, v) => sum + v * v, 0) / values.length);

/** Greatest deviation from zero. */
export const worst = (values: readonly number[]): number | null =>
  values.length === 0 ? null : Math.max(...values.map(Math.abs));

export function median(values: readonly number[]): number | null {
  const sorted = [...values].sort((a, b) => a - b);
  return sorted[sorted.length >> 1] ?? null;
}
