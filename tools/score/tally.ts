import type { Series } from './series.js';
import type { Unsound } from './soundState.js';

/** Sum of errors of one figure, with the worst and where it was. */
export interface Sum {
  n: number;
  squares: number;
  worst: number;
  at: string;
  /** Errors that are no finite number: with one there is no rms that meets a goal. */
  broken: number;
}

export const emptySum = (): Sum => ({ n: 0, squares: 0, worst: 0, at: '', broken: 0 });

export function addError(sum: Sum, error: number, at: () => string): void {
  if (!Number.isFinite(error)) {
    sum.broken++;
    return;
  }
  sum.n++;
  sum.squares += error * error;
  if (Math.abs(error) <= Math.abs(sum.worst)) return;
  sum.worst = error;
  sum.at = at();
}

/** The sum of a name, made on its first use. */
export function sumOf(sums: Record<string, Sum>, name: string): Sum {
  const known = sums[name] ?? emptySum();
  sums[name] = known;
  return known;
}

export const mergeSum = (into: Sum, from: Sum): void => {
  into.n += from.n;
  into.squares += from.squares;
  into.broken += from.broken;
  if (Math.abs(from.worst) <= Math.abs(into.worst)) return;
  into.worst = from.worst;
  into.at = from.at;
};

/** Null where there is none, infinite where an error was no finite number. */
export function rmsOf(sum: Sum | undefined): number | null {
  if (!sum || sum.n + sum.broken === 0) return null;
  return sum.broken > 0 ? Number.POSITIVE_INFINITY : Math.sqrt(sum.squares / sum.n);
}

/** The worst error, as rmsOf. */
export function worstOf(sum: Sum | undefined): number | null {
  if (!sum || sum.n + sum.broken === 0) return null;
  return sum.broken > 0 ? Number.POSITIVE_INFINITY : Math.abs(sum.worst);
}

/** One answer of hours against the truth, with what straight lines said. */
export interface HoursSample {
  readonly at_h: number;
  readonly truth: number;
  readonly p90: number;
  readonly p50: number;
  readonly p10: number;
  readonly line: number;
}

/** Everything that one run of a row leaves behind. */
export interface RowResult {
  readonly seed: number;
  /** Duration that was scored [h]. */
  readonly scored_h: number;
  /** By figure, and by figure and store as `figure store`. */
  readonly sums: Readonly<Record<string, Sum>>;
  readonly hours: readonly HoursSample[];
  /** Times at which truth and estimate disagree on how many fronts there are, and all. */
  readonly fronts: { readonly unmatched: number; readonly all: number };
  readonly rejections: readonly { sensor: string; verdict: string; from_h: number; to_h: number }[];
  readonly not_finite: number;
  readonly unsound: Unsound;
  /** Figures of the scenario's own; null where the run has none. */
  readonly own: Readonly<Record<string, number | null>>;
}

/** Scoring begins this long after the start [s]. */
const SETTLE_S = 3600;
const QUANTILE_90 = 1.2815515655446004;

/**
 * Scores a series against its truth.
 *
 * Sums: soc and its line and what the strings could see [%], stored heat [MWh], position and width
 * [m], hours [h], and each over its sigma (`soc/sigma` and so on).
 */
export function tally(series: Series, seed: number, own: RowResult['own'] = {}): RowResult {
  const { recording, unit } = series;
  const { period_s } = recording.header;
  const sums: Record<string, Sum> = {};
  const first = Math.max(series.from, Math.round(SETTLE_S / period_s));
  const hourOf = (n: number) => ((n + 1) * period_s) / 3600;
  const fronts = { unmatched: 0, all: 0 };
  const seen = unit.stores[0]!.strings.length > 1 ? 'seen_all' : 'seen_one';
  for (const [id, store] of Object.entries(series.stores)) {
    const truth = (name: string, n: number) => recording.truth(`${id}.${name}`, n);
    for (let n = first; n < series.to; n++) {
      if (Number.isNaN(store.soc[n])) continue;
      const at = () => `seed ${seed} ${id} ${hourOf(n).toFixed(2)} h`;
      const add = (name: string, error: number) => {
        addError(sumOf(sums, name), error, at);
        addError(sumOf(sums, `${name} ${id}`), error, at);
      };
      const soc = truth('soc', n);
      const error = store.soc[n]! - soc;
      add('soc', 100 * error);
      add('soc/seen', 100 * (store.soc[n]! - truth(seen, n)));
      add('soc/sigma', error / store.soc_sigma[n]!);
      add('line soc', 100 * (store.line_soc[n]! - soc));
      add('seen soc', 100 * (truth(seen, n) - soc));
      const heat = store.stored[n]! - truth('stored_MWh_th', n);
      add('stored', heat);
      add('stored/sigma', heat / store.stored_sigma[n]!);
      const found = store.fronts[n]!;
      fronts.all++;
      if (found.length !== truth('fronts', n)) {
        fronts.unmatched++;
        continue;
      }
      found.slice(0, 3).forEach((front, i) => {
        if (front.position_m === null) return;
        const off = front.position_m - truth(`position_${i}`, n);
        add('position', off);
        if (front.position_sigma_m !== null) add('position/sigma', off / front.position_sigma_m);
        const width = truth(`width_${i}`, n);
        if (front.width_m !== null && Number.isFinite(width)) add('width', front.width_m - width);
      });
    }
  }
  const hours: HoursSample[] = [];
  for (const h of series.hours) {
    if (h.scan < first) continue;
    hours.push({
      at_h: hourOf(h.scan),
      truth: h.truth_h,
      p90: h.p90,
      p50: h.p50,
      p10: h.p10,
      line: h.line_h,
    });
    if (h.truth_h === 0) continue;
    const at = () => `seed ${seed} ${hourOf(h.scan).toFixed(2)} h`;
    addError(sumOf(sums, 'hours'), h.p50 - h.truth_h, at);
    const sigma = (h.p10 - h.p90) / (2 * QUANTILE_90);
    addError(sumOf(sums, 'hours/sigma'), (h.p50 - h.truth_h) / sigma, at);
    addError(sumOf(sums, 'line hours'), h.line_h - h.truth_h, at);
  }
  return {
    seed,
    scored_h: ((series.to - first) * period_s) / 3600,
    sums,
    hours,
    fronts,
    rejections: series.rejections.map((r) => ({
      sensor: r.sensor,
      verdict: r.verdict,
      from_h: hourOf(r.from),
      to_h: hourOf(r.to),
    })),
    not_finite: series.not_finite,
    unsound: series.unsound,
    own,
  };
}
