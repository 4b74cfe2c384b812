import { Recording } from '../../tools/score/recording.js';
import { unitWith } from '../../tools/score/sensorSets.js';
import type { Series, StoreSeries } from '../../tools/score/series.js';
import { sound } from '../../tools/score/soundState.js';
import { TRUTH_COLUMNS } from '../../tools/score/truthColumns.js';

/** What is true and what is estimated of both stores at a scan. */
export interface Point {
  readonly soc: number;
  readonly found_soc: number;
  readonly soc_sigma: number;
  readonly position_m: number;
  readonly found_position_m: number | null;
}

/** A series of the unit with all sensors, made of given truths and estimates; no estimator runs. */
export function syntheticSeries(
  scans: number,
  point: (n: number) => Point,
  more: Partial<Pick<Series, 'hours' | 'rejections' | 'not_finite'>> = {},
): Series {
  const unit = unitWith('all', 'class');
  const truths = Array.from({ length: scans }, (_, n) => {
    const { soc, position_m } = point(n);
    const values: Record<string, number> = {};
    for (const { id } of unit.stores) {
      values[`${id}.soc`] = soc;
      values[`${id}.stored_MWh_th`] = 30 * soc;
      values[`${id}.fronts`] = 1;
      values[`${id}.position_0`] = position_m;
      values[`${id}.width_0`] = 0.5;
      values[`${id}.seen_all`] = soc + 0.001;
    }
    return TRUTH_COLUMNS.map((name) => values[name] ?? 0);
  });
  const recording = Recording.make(
    Array.from({ length: scans }, (_, n) => ({ time_s: 60 * (n + 1), readings: {} })),
    truths,
    { start_s: 0, period_s: 60, temperatures: [], others: [], truths: TRUTH_COLUMNS, hours: [] },
  );
  const column = (of: (p: Point) => number) =>
    Float64Array.from({ length: scans }, (_, n) => of(point(n)));
  const store = (): StoreSeries => ({
    soc: column((p) => p.found_soc),
    soc_sigma: column((p) => p.soc_sigma),
    stored: column((p) => 30 * p.found_soc),
    stored_sigma: column((p) => 60 * p.soc_sigma),
    fronts: Array.from({ length: scans }, (_, n) => {
      const at = point(n).found_position_m;
      if (at === null) return [];
      return [{ position_m: at, position_sigma_m: 0.02, width_m: 0.52, width_sigma_m: 0.01 }];
    }),
    transfer: column(() => 1),
    transfer_sigma: column(() => 0.1),
    flow: Array.from({ length: 3 }, () => column(() => 1)),
    line_soc: column((p) => p.soc + 0.02),
  });
  return {
    unit,
    recording,
    from: 0,
    to: scans,
    stores: Object.fromEntries(unit.stores.map(({ id }) => [id, store()])),
    hours: [],
    rejections: [],
    not_finite: 0,
    unsound: sound(),
    snapshots: new Map(),
    ...more,
  };
}
