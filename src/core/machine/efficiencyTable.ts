import type { Direction, EfficiencyTableDefinition } from '../definitions.js';
import { requireAscending, requirePositive } from '../misuse.js';
import type { OperatingPoint, StoreTemperatures } from './machine.js';

const NO_LOOP = {
  compressor_in_K: null,
  compressor_out_K: null,
  expander_in_K: null,
  expander_out_K: null,
} as const;

/**
 * A single hot store whose machines are known by an efficiency against outlet temperature.
 *
 * Discharging, per kilogram of fluid: w = (h(T_out) - h(T_return)) eta(T_out), eta by straight
 * lines between the points of the table; beyond its ends the end value, with `clamped` set.
 * Charging: the heater takes the fluid from the store's outlet to its own temperature,
 * w = (h(T_charge) - h(T_out))/charge_efficiency; gas that leaves the store hotter than the
 * heater's temperature passes it unchanged and takes no electricity. `auxiliary_running_W` comes
 * on top in both directions: leave it 0 where the table's efficiency already contains it.
 *
 * @returns the function `operate` of the machine; `shaftWork` is the heat that was converted times
 *   eta, or the heat that was made
 * @throws RangeError for lists of unequal length, outlet temperatures that do not ascend, an
 *   efficiency outside 0..1 or a charge efficiency that is not above 0
 */
export function createEfficiencyTable(
  definition: EfficiencyTableDefinition,
): (direction: Direction, outlets: StoreTemperatures, ambient_K: number) => OperatingPoint {
  const { fluid, outlet_K, efficiency } = definition;
  requireAscending('outlet_K', outlet_K);
  if (outlet_K.length === 0) throw new RangeError('outlet_K must hold at least one point, got 0');
  if (efficiency.length !== outlet_K.length) {
    throw new RangeError(
      `efficiency must be as long as outlet_K (${outlet_K.length}), got ${efficiency.length}`,
    );
  }
  efficiency.forEach((value, i) => {
    if (!(value >= 0 && value <= 1)) {
      throw new RangeError(`efficiency[${i}] must lie between 0 and 1, got ${value}`);
    }
  });
  const returnK = requirePositive('return_K', definition.return_K);
  const chargeK = requirePositive('charge_inlet_K', definition.charge_inlet_K);
  const chargeEfficiency = requirePositive('charge_efficiency', definition.charge_efficiency);
  const last = outlet_K.length - 1;
  const firstK = outlet_K[0] as number;
  const lastK = outlet_K[last] as number;
  const hReturn = fluid.enthalpy(returnK);
  const hCharge = fluid.enthalpy(chargeK);

  const efficiencyAt = (at: number): number => {
    if (at <= firstK) return efficiency[0] as number;
    for (let i = 1; i <= last; i++) {
      const right = outlet_K[i] as number;
      if (at > right) continue;
      const left = outlet_K[i - 1] as number;
      const from = efficiency[i - 1] as number;
      return from + (((efficiency[i] as number) - from) * (at - left)) / (right - left);
    }
    return efficiency[last] as number;
  };

  return (direction, outlets) => {
    const outlet = requirePositive('outlets.hot_K', outlets.hot_K);
    if (direction === 'charge') {
      const heat = Math.max(0, hCharge - fluid.enthalpy(outlet));
      const work = heat / chargeEfficiency;
      return {
        specificWork_J_kg: work,
        shaftWork_J_kg: heat,
        inlets: { hot_K: Math.max(chargeK, outlet), cold_K: null },
        loop: NO_LOOP,
        heatRejected_J_kg: work - heat,
        clamped: false,
      };
    }
    const heat = fluid.enthalpy(outlet) - hReturn;
    const work = heat * efficiencyAt(outlet);
    return {
      specificWork_J_kg: work,
      shaftWork_J_kg: work,
      inlets: { hot_K: returnK, cold_K: null },
      loop: NO_LOOP,
      heatRejected_J_kg: heat - work,
      clamped: outlet < firstK || outlet > lastK,
    };
  };
}
