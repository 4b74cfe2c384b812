import type { UnitDefinition } from '../../../src/core/definitions.js';
import type { Estimate } from '../../../src/core/estimate.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';

/** As much of a unit as the history needs: one store with one string. */
export const unit = {
  id: 'u',
  hours_at_W: [1.8e6],
  stores: [{ id: 'hot', strings: [{ id: 'axis' }] }],
} as unknown as UnitDefinition;

export const NOTHING = { flow_kg_s: null, power_MW_el: null };

export function estimate(time_ms: number, soc: number, changes: Partial<Estimate> = {}): Estimate {
  return {
    time: new Date(time_ms).toISOString(),
    unit: 'u',
    revision: 0,
    mode: 'charge',
    quality: 'good',
    state_of_charge: soc,
    stores: {
      hot: {
        soc,
        soc_sigma: 0.01,
        stored_MWh_th: 10,
        stored_sigma_MWh_th: 0.1,
        fronts: [{ position_m: 3, position_sigma_m: 0.1, width_m: null, width_sigma_m: null }],
        fronts_reason: null,
        energy_position_m: 3.1,
        spread_ratio: 1 + soc,
        heat_transfer_factor: 1,
        heat_transfer_factor_sigma: 0.1,
        strings: [
          { id: 'axis', flow_factor: 1, flow_factor_sigma: 0.01, position_m: 3, width_m: 0.4 },
        ],
        front_views: [],
        sensors: { used: 14, rejected: [] },
        outlet_K: 300,
      },
    },
    ...changes,
  };
}

export function event(
  time_ms: number,
  transition: WatchEvent['transition'],
  kind: WatchEvent['kind'] = 'front_spread',
): WatchEvent {
  return {
    id: `u/${kind}/hot`,
    unit: 'u',
    kind,
    class: 'alert',
    priority: 'low',
    subject: 'hot',
    transition,
    time: new Date(time_ms).toISOString(),
    value: 1.6,
    limit: 1.5,
    message: 'the front is 1.6 times as wide as in a healthy bed',
  };
}
