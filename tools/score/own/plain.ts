import type { UnitDefinition } from '../../../src/core/definitions.js';
import type { RowPlan, Runner } from '../scenario.js';
import { unitWith } from '../sensorSets.js';
import { runSeries, type Series } from '../series.js';
import { type RowResult, tally } from '../tally.js';

/**
 * Reads the whole recording with each row's sensors; `own` adds figures of the scenario, `told` is
 * what else the unit's configuration says.
 */
export function plain(
  hours: boolean,
  own?: (series: Series, seed: number) => RowResult['own'],
  told: (unit: UnitDefinition) => UnitDefinition = (unit) => unit,
): Runner {
  return (recording, seed, rows) =>
    Object.fromEntries(
      rows.map((row: RowPlan) => {
        const unit = told(unitWith(row.set, row.errors));
        const series = runSeries(unit, recording, { errors: row.errors, hours });
        return [row.id, tally(series, seed, own?.(series, seed))];
      }),
    );
}
