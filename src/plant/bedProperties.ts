import type { BedDefinition } from '../core/definitions.js';
import { film, insideResistance, standingConductivity, surfacePerVolume } from './transferLaws.js';

/** Tables of a bed of the demonstration plant over temperature and enthalpy, made once. */
export interface BedProperties {
  /** Heat in the bed per volume [J/m3] and back, by straight lines between the same nodes. */
  heatAt(temperature_K: number): number;
  temperatureAt(heat_J_m3: number): number;
  /** Volumetric heat transfer [W/m3K] before the plant's own factor, at a mass flux [kg/m2s]. */
  transfer(temperature_K: number, flux06: number): number;
  /** Enthalpy of the gas [J/kg] and its slope [J/kgK]: straight lines between whole kelvins. */
  gasEnthalpy(temperature_K: number): number;
  gasCapacity(temperature_K: number): number;
  /** Conductivity of the standing bed [W/mK]. */
  conductivity(temperature_K: number): number;
}

const LOW_K = 80;
const HIGH_K = 1300;
const STEP_K = 1;
const COUNT = Math.round((HIGH_K - LOW_K) / STEP_K) + 1;
const HEAT_NODES = 8192;

/**
 * Heat of the bed = heat_capacity_factor (1 - eps) rho_s h_s(T), and for a liquid the fluid in the
 * voids at the rock's temperature: its heat counts, the small lag between the two does not.
 */
export function bedProperties(bed: BedDefinition): BedProperties {
  const solid = (1 - bed.void_fraction) * bed.solid.density_kg_m3 * bed.heat_capacity_factor;
  const { fluid } = bed;
  const liquid = fluid.phase === 'liquid' ? bed.void_fraction : 0;
  const heat = new Float64Array(COUNT);
  const still = new Float64Array(COUNT);
  const flow = new Float64Array(COUNT);
  const resistance = new Float64Array(COUNT);
  const conductivity = new Float64Array(COUNT);
  const gas = new Float64Array(COUNT);
  for (let i = 0; i < COUNT; i++) {
    const T = LOW_K + i * STEP_K;
    heat[i] =
      solid * bed.solid.enthalpy(T) +
      (liquid > 0 ? liquid * fluid.density_kg_m3(T, bed.pressure_Pa) * fluid.enthalpy(T) : 0);
    const own = film(bed, T);
    gas[i] = fluid.enthalpy(T);
    still[i] = own.still;
    flow[i] = own.flow;
    resistance[i] = insideResistance(bed, T);
    conductivity[i] = bed.conductivity_factor * standingConductivity(bed, T);
  }
  const surface = surfacePerVolume(bed) * bed.heat_transfer_factor;
  const first = heat[0] as number;
  const perNode = ((heat[COUNT - 1] as number) - first) / (HEAT_NODES - 1);
  const temperature = new Float64Array(HEAT_NODES);
  for (let n = 0, i = 0; n < HEAT_NODES; n++) {
    const target = first + n * perNode;
    while (i < COUNT - 2 && (heat[i + 1] as number) < target) i++;
    const a = heat[i] as number;
    temperature[n] = LOW_K + STEP_K * (i + (target - a) / ((heat[i + 1] as number) - a));
  }
  const nearest = (T: number) => {
    if (!(T >= LOW_K && T < HIGH_K))
      throw new RangeError(`temperature_K must lie in 80..1300, got ${T}`);
    return ((T - LOW_K) / STEP_K + 0.5) | 0;
  };
  return {
    heatAt(T) {
      nearest(T);
      let low = 0;
      let high = HEAT_NODES - 1;
      while (high - low > 1) {
        const middle = (low + high) >> 1;
        if ((temperature[middle] as number) <= T) low = middle;
        else high = middle;
      }
      const a = temperature[low] as number;
      return first + perNode * (low + (T - a) / ((temperature[high] as number) - a));
    },
    temperatureAt(q) {
      const y = (q - first) / perNode;
      const i = y < 0 ? -1 : y | 0;
      if (!(i >= 0 && i < HEAT_NODES - 1))
        throw new RangeError(`heat_J_m3 outside 80..1300 K, got ${q}`);
      const a = temperature[i] as number;
      return a + (y - i) * ((temperature[i + 1] as number) - a);
    },
    transfer(T, flux06) {
      const i = nearest(T);
      const h = (still[i] as number) + flux06 * (flow[i] as number);
      return surface / (1 / h + (resistance[i] as number));
    },
    gasEnthalpy(T) {
      nearest(T);
      const y = (T - LOW_K) / STEP_K;
      const i = y | 0;
      const a = gas[i] as number;
      return a + (y - i) * ((gas[i + 1] as number) - a);
    },
    gasCapacity(T) {
      nearest(T);
      const i = ((T - LOW_K) / STEP_K) | 0;
      return ((gas[i + 1] as number) - (gas[i] as number)) / STEP_K;
    },
    conductivity: (T) => conductivity[nearest(T)] as number,
  };
}
