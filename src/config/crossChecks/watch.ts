import type { Path } from '../faults.js';
import type { UnitBlock } from '../schema/site.js';
import { type CrossFault, cross } from './cross.js';

/** Contradictions within `watch`. */
export function watchFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const at: Path = [...path, 'watch'];
  const { spread_ratio, data_age_s } = unit.watch;
  const faults: CrossFault[] = [];
  if (spread_ratio.limit - spread_ratio.deadband <= 1) {
    faults.push(
      cross(
        [...at, 'spread_ratio', 'deadband'],
        spread_ratio.deadband,
        `less than limit - 1 (${Number((spread_ratio.limit - 1).toFixed(3))}): a healthy front has a ratio of 1 and must let the alert return`,
        { others: [[...at, 'spread_ratio', 'limit']] },
      ),
    );
  }
  if (data_age_s.limit !== undefined) {
    const limit: Path = [...at, 'data_age_s', 'limit'];
    if (data_age_s.limit <= unit.scan_period_s) {
      faults.push(
        cross(limit, data_age_s.limit, `more than the scan period (${unit.scan_period_s} s)`, {
          others: [[...path, 'scan_period_s']],
        }),
      );
    }
    if (data_age_s.deadband >= data_age_s.limit) {
      faults.push(
        cross(
          [...at, 'data_age_s', 'deadband'],
          data_age_s.deadband,
          `less than limit (${data_age_s.limit})`,
          {
            others: [limit],
          },
        ),
      );
    }
  }
  return [...faults, ...indicatorFaults(unit, [...at, 'indicators'])];
}

/** Of these a healthy value is 1, of the others 0: what lies between it and the limit bounds the deadband. */
const RATIOS = new Set(['heat_transfer', 'standing_loss', 'pressure_drop']);

/** A deadband as wide as the limit is far from healthy would never let an alert return. */
function indicatorFaults(unit: UnitBlock, at: Path): CrossFault[] {
  const { in_control_days: _, baseline_from: __, ...kinds } = unit.watch.indicators;
  return Object.entries(kinds).flatMap(([kind, { limit, deadband }]) => {
    const room = RATIOS.has(kind) ? Math.abs(limit - 1) : limit;
    if (deadband < room) return [];
    const words = RATIOS.has(kind)
      ? `less than limit is away from 1 (${Number(room.toFixed(6))})`
      : `less than limit (${limit})`;
    const what = `${words}: a healthy value must let the alert return`;
    return [cross([...at, kind, 'deadband'], deadband, what, { others: [[...at, kind, 'limit']] })];
  });
}
