import type { Measured } from '../adapters/history/series.js';
import type { UnitDefinition } from '../core/definitions.js';
import type { Estimate } from '../core/estimate.js';
import type { Scan } from '../core/scan/scan.js';

/** Flow (positive while charging) and net power as measured in a scan. */
export function measuredIn(unit: UnitDefinition, scan: Scan, estimate: Estimate): Measured {
  let flow = Number.NaN;
  let power = Number.NaN;
  unit.channels.forEach(({ role }, i) => {
    const value = scan.values[i]!;
    if (Number.isNaN(value)) return;
    if (role.kind === 'power') power = value / 1e6;
    if (role.kind !== 'flow') return;
    if (role.sense === 'signed') flow = value;
    else if (role.sense === 'unsigned') flow = estimate.mode === 'discharge' ? -value : value;
    else flow = (Number.isNaN(flow) ? 0 : flow) + (role.sense === 'charge' ? value : -value);
  });
  return {
    flow_kg_s: Number.isFinite(flow) ? flow : null,
    power_MW_el: Number.isFinite(power) ? power : null,
  };
}
