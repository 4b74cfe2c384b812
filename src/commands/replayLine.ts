import type { Estimate, StoreEstimate } from '../core/estimate.js';
import type { UnitStep } from '../core/unit.js';

/** What the contract names of a store, in its order; then what rockhour adds. */
function storeLine(store: StoreEstimate): Record<string, unknown> {
  const { soc, soc_sigma, stored_MWh_th, stored_sigma_MWh_th, ...afterStored } = store;
  const { fronts, fronts_reason, energy_position_m, spread_ratio, ...afterRatio } = afterStored;
  const { heat_transfer_factor, heat_transfer_factor_sigma, strings, sensors, ...more } =
    afterRatio;
  return {
    soc,
    soc_sigma,
    stored_MWh_th,
    stored_sigma_MWh_th,
    fronts: fronts.map(({ position_m, position_sigma_m, width_m, width_sigma_m }) => ({
      position_m,
      position_sigma_m,
      width_m,
      width_sigma_m,
    })),
    fronts_reason,
    energy_position_m,
    spread_ratio,
    heat_transfer_factor,
    heat_transfer_factor_sigma,
    strings: strings.map(({ id, flow_factor, flow_factor_sigma, position_m, width_m }) => ({
      id,
      flow_factor,
      flow_factor_sigma,
      position_m,
      width_m,
    })),
    sensors: {
      used: sensors.used,
      rejected: sensors.rejected.map(({ id, verdict, since, ...rest }) => ({
        id,
        verdict,
        since,
        ...rest,
      })),
    },
    ...more,
  };
}

function dispatchLine(dispatch: NonNullable<Estimate['dispatch']>): unknown[] {
  return dispatch.map(({ power_MW, hours, energy_MWh_el, ends_by, ...more }) => ({
    power_MW,
    hours: { p90: hours.p90, p50: hours.p50, p10: hours.p10 },
    energy_MWh_el: { p90: energy_MWh_el.p90, p50: energy_MWh_el.p50, p10: energy_MWh_el.p10 },
    ends_by,
    ...more,
  }));
}

/**
 * One line of `rockhour replay`: the keys of the contract in its order, then rockhour's own. Numbers
 * are finite or null, as JSON has no other.
 */
export function replayLine({ estimate, events }: UnitStep): string {
  const { time, unit, revision, mode, quality, state_of_charge, stores, dispatch, ...more } =
    estimate;
  const line: Record<string, unknown> = {
    time,
    unit,
    revision,
    mode,
    quality,
    state_of_charge,
    stores: Object.fromEntries(Object.entries(stores).map(([id, store]) => [id, storeLine(store)])),
  };
  if (dispatch !== undefined) line.dispatch = dispatchLine(dispatch);
  line.events = events;
  return JSON.stringify({ ...line, ...more });
}
