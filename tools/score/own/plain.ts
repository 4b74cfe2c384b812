import type { RowPlan, Runner } from '../scenario.js';
import { unitWith } from '../sensorSets.js';
import { runSeries, type Series } from '../series.js';
import { type RowResult, tally } from '../tally.js';

/** Reads the whole recording with each row's sensors; `own` adds figures of the scenario. */
export function plain(
  hours: boolean,
  own?: (series: Series, seed: number) => RowResult['own'],
): Runner {
  return (recording, seed, rows) =>
    Object.fromEntries(
      rows.map((row: RowPlan) => {
        const unit = unitWith(row.set, row.errors);
        const series = runSeries(unit, recording, { errors: row.errors, hours });
        return [row.id, tally(series, seed, own?.(series, seed))];
      }),
    );
}
