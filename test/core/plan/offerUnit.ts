import type { UnitDefinition } from '../../../src/core/definitions.js';
import { planContext } from '../../../src/core/plan/context.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { watchedUnit } from '../dispatch/fullUnit.js';
import type { Fronts } from '../track/fronted.js';
import { unitOf } from '../track/plants.js';

export const H = 3600;
export const HOUR_MS = H * 1000;

const plain = unitOf();

/** The small plant of about 60 kW with ramps of 10 min, start-ups and a change-over. */
export const unit: UnitDefinition = unitOf({
  limits: {
    ...plain.limits,
    operation: {
      ramp_W_s: { charge: 100, discharge: 100 },
      start: {
        warm: { time_s: 360, energy_J: 1.8e6 },
        cold: { time_s: 1200, energy_J: 7.2e6 },
        cold_after_s: 8 * H,
      },
      change_over_s: 300,
    },
  },
});

/** What a question is answered from, with the fronts standing there; the time is 00:03 of 1970. */
export function contextOf(fronts: Fronts, of: UnitDefinition = unit) {
  return planContext(unitModel(of), watchedUnit(of, fronts, 3));
}
