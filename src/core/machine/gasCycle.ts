import type { Direction, GasCycleDefinition } from '../definitions.js';
import { requireEfficiency, requireNotNegative, requirePositive } from '../misuse.js';
import type { OperatingPoint, StoreTemperatures } from './machine.js';
import { polytropicEnd } from './polytropic.js';

/**
 * Closed gas cycle between a hot store at high and a cold store at low pressure.
 *
 * Charging:    cold store -> cooler -> compressor -> hot store -> cooler -> expander -> cold store
 * Discharging: hot store -> expander -> cooler -> cold store -> compressor -> cooler -> hot store
 *
 * A cooler only cools: its outlet is the lower of its inlet and ambient + approach. Compressor and
 * expander are polytropic (`polytropicEnd`). The two pressures are those of the compressor's inlet
 * and outlet; of the loop's pressure loss f one half is lost on each level, so that the expander
 * has the ratio (p_high/p_low) (1 - f/2)^2. Kinetic energy and the compressor's heat loss are left
 * out. Shaft work is the difference of the two machines, turned into electricity by the motor or
 * the generator efficiency, whichever way it flows.
 *
 * The first law closes around the loop: shaft work + heat out of the cold store = heat into the
 * hot store + heat rejected (charging; discharging with all signs turned but the last).
 *
 * @returns the function `operate` of the machine
 * @throws RangeError for an impossible definition
 */
export function createGasCycle(
  definition: GasCycleDefinition,
): (direction: Direction, outlets: StoreTemperatures, ambient_K: number) => OperatingPoint {
  const { gas, loop_pressure_loss: loss } = definition;
  if (gas.phase !== 'gas' || gas.entropy === undefined) {
    throw new RangeError(`gas must be a gas with an entropy, got ${gas.name}`);
  }
  const low = requirePositive('low_pressure_Pa', definition.low_pressure_Pa);
  const high = requirePositive('high_pressure_Pa', definition.high_pressure_Pa);
  const compressor = requireEfficiency(
    'compressor_polytropic_efficiency',
    definition.compressor_polytropic_efficiency,
  );
  const expander = requireEfficiency(
    'expander_polytropic_efficiency',
    definition.expander_polytropic_efficiency,
  );
  const motor = requireEfficiency('motor_efficiency', definition.motor_efficiency);
  const generator = requireEfficiency('generator_efficiency', definition.generator_efficiency);
  const approach = requireNotNegative('cooler_approach_K', definition.cooler_approach_K);
  if (!(loss >= 0 && loss < 1)) {
    throw new RangeError(`loop_pressure_loss must lie between 0 and 1, got ${loss}`);
  }
  const expansionRatio = (high / low) * (1 - loss / 2) ** 2;
  if (!(expansionRatio > 1)) {
    throw new RangeError(
      `high_pressure_Pa must exceed low_pressure_Pa by more than the loss, got ${high} over ${low}`,
    );
  }
  const up = Math.log(high / low) / compressor;
  const down = -Math.log(expansionRatio) * expander;
  const h = (temperature_K: number) => gas.enthalpy(temperature_K);
  const toElectricity = (taken: number) => (taken > 0 ? taken / motor : taken * generator);

  return (direction, outlets, ambient_K) => {
    const hotOut = requirePositive('outlets.hot_K', outlets.hot_K);
    if (outlets.cold_K === null) {
      throw new RangeError('outlets.cold_K must be given: a gas cycle has two stores, got null');
    }
    const coldOut = requirePositive('outlets.cold_K', outlets.cold_K);
    const cooled = requirePositive('ambient_K', ambient_K) + approach;

    const charging = direction === 'charge';
    const compressorIn = charging ? Math.min(coldOut, cooled) : coldOut;
    const compressorOut = polytropicEnd(gas, compressorIn, up);
    const expanderIn = charging ? Math.min(hotOut, cooled) : hotOut;
    const expanderOut = polytropicEnd(gas, expanderIn, down);
    const hotIn = charging ? compressorOut : Math.min(compressorOut, cooled);
    const coldIn = charging ? expanderOut : Math.min(expanderOut, cooled);

    const compression = h(compressorOut) - h(compressorIn);
    const expansion = h(expanderIn) - h(expanderOut);
    const rejected = charging
      ? h(coldOut) - h(compressorIn) + h(hotOut) - h(expanderIn)
      : h(compressorOut) - h(hotIn) + h(expanderOut) - h(coldIn);
    const taken = compression - expansion;
    return {
      specificWork_J_kg: charging ? toElectricity(taken) : -toElectricity(taken),
      shaftWork_J_kg: charging ? taken : -taken,
      inlets: { hot_K: hotIn, cold_K: coldIn },
      loop: {
        compressor_in_K: compressorIn,
        compressor_out_K: compressorOut,
        expander_in_K: expanderIn,
        expander_out_K: expanderOut,
      },
      heatRejected_J_kg: rejected,
      clamped: false,
    };
  };
}
