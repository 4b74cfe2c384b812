import type { UnitDefinition } from '../../../src/core/definitions.js';
import type { HoursInput } from '../../../src/core/dispatch/hours.js';
import { hoursInput } from '../../../src/core/dispatch/unitHours.js';
import { advance, startUnit } from '../../../src/core/unit.js';
import { unitModel } from '../../../src/core/unitModel.js';
import type { UnitState } from '../../../src/core/unitState.js';
import { mulberry } from '../../support/random.js';
import { type Fronts, frontedScan } from '../track/fronted.js';

/** A unit that has watched these fronts at rest for some scans. */
export function watchedUnit(unit: UnitDefinition, fronts: Fronts, scans = 10): UnitState {
  const state = startUnit(unit);
  const random = mulberry(17);
  const noise = (): number => random() - 0.5;
  for (let n = 1; n <= scans; n++) {
    const scan = frontedScan(unit, n * 60_000, fronts, { flow: 0, mode: 0 }, noise);
    advance(unit, state, scan, { hours_at_W: [], profile: false });
  }
  return state;
}

export function inputOf(unit: UnitDefinition, state: UnitState): HoursInput {
  return hoursInput(unitModel(unit), state, unit.rated_power_W);
}
