/**
 * Rocks of the finer plant. Heat capacities above 298 K: Robertson & Hemingway, USGS Open-File
 * Report 95-622, form c = 1000 (a1 + a2 1e-4 T + a3 1e4/T^2 + a4/sqrt T) [J/kgK]. Below 298 K
 * those fits are invalid; there c falls as measured on silicate rock between 100 and 350 K:
 * c = -3.6125 + 2.7431 T + 2.3616e-3 T^2 - 1.2340e-5 T^3 + 8.9093e-9 T^4 (fit of Hayne et al.
 * 2017 to Hemingway, Robie & Wilson 1973 [M]), scaled to meet the upper branch at 298.15 K.
 */
export interface TruthSolid {
  readonly name: string;
  readonly density_kg_m3: number;
  readonly emissivity: number;
  heatCapacity(temperature_K: number): number;
  conductivity(temperature_K: number): number;
}

function lowTemperature(T: number): number {
  return -3.6125 + T * (2.7431 + T * (2.3616e-3 + T * (-1.234e-5 + T * 8.9093e-9)));
}

const JOIN_K = 298.15;

function usgs(a1: number, a2: number, a3: number, a4: number, top_K: number) {
  const high = (T: number) =>
    1000 * (a1 + a2 * 1e-4 * T + (a3 * 1e4) / (T * T) + a4 / Math.sqrt(T));
  const scale = high(JOIN_K) / lowTemperature(JOIN_K);
  return (T: number) =>
    T < JOIN_K ? scale * lowTemperature(Math.max(T, 60)) : high(Math.min(T, top_K));
}

export const SOLIDS: Readonly<Record<string, TruthSolid>> = {
  granite: {
    name: 'granite',
    density_kg_m3: 2640,
    emissivity: 0.88,
    heatCapacity: usgs(2.29354, -1.9986, 2.0526, -29.3049, 1000),
    // Zoth & Haenel 1988 for granites and similar rocks, T in degC [M].
    conductivity: (T) => 0.7 + 770 / (350 + Math.max(T, 173.15) - 273.15),
  },
  basalt: {
    name: 'basalt',
    density_kg_m3: 2900,
    emissivity: 0.88,
    heatCapacity: usgs(1.65291, -0.9541, -0.89296, -13.5666, 1000),
    // Nahhas et al. 2019: k = 1/(0.4 - 2.68e-5 T).
    conductivity: (T) => 1 / (0.4 - 2.68e-5 * T),
  },
  quartzite: {
    name: 'quartzite and sand',
    density_kg_m3: 2640,
    emissivity: 0.85,
    // Pacheco et al. 2002 give one constant.
    heatCapacity: () => 1050,
    conductivity: () => 2.5,
  },
  /** Constant properties, for comparison with closed solutions. */
  constant: {
    name: 'constant',
    density_kg_m3: 2500,
    emissivity: 0.9,
    heatCapacity: () => 1000,
    conductivity: () => 1e9,
  },
};

const LOW_K = 70;
const HIGH_K = 1300;
const FINE_STEP_K = 0.05;

/** c(T) turned into tables over specific enthalpy: temperature and heat capacity, linear between nodes. */
export class EnthalpyTable {
  readonly size: number;
  readonly zero: number;
  readonly perStep: number;
  readonly temperature: Float64Array;
  readonly capacity: Float64Array;

  constructor(heatCapacity: (temperature_K: number) => number, size = 16384) {
    const count = Math.round((HIGH_K - LOW_K) / FINE_STEP_K) + 1;
    const h = new Float64Array(count);
    for (let i = 1; i < count; i++) {
      const T = LOW_K + (i - 1) * FINE_STEP_K;
      const d = FINE_STEP_K;
      h[i] =
        h[i - 1]! + ((heatCapacity(T) + 4 * heatCapacity(T + d / 2) + heatCapacity(T + d)) * d) / 6;
    }
    this.size = size;
    this.zero = 0;
    const step = h[count - 1]! / (size - 1);
    this.perStep = 1 / step;
    this.temperature = new Float64Array(size);
    this.capacity = new Float64Array(size);
    let j = 0;
    for (let i = 0; i < size; i++) {
      const target = i * step;
      while (j < count - 2 && h[j + 1]! < target) j++;
      const T = LOW_K + FINE_STEP_K * (j + (target - h[j]!) / (h[j + 1]! - h[j]!));
      this.temperature[i] = T;
      this.capacity[i] = heatCapacity(T);
    }
  }

  /** Temperature [K] at an enthalpy [J/kg] above that of 70 K. */
  temperatureAt(enthalpy: number): number {
    const y = enthalpy * this.perStep;
    const i = y | 0;
    if (!(y >= 0 && i < this.size - 1))
      throw new RangeError(`enthalpy ${enthalpy} J/kg outside 70-1300 K`);
    const a = this.temperature[i]!;
    return a + (y - i) * (this.temperature[i + 1]! - a);
  }

  /** Enthalpy [J/kg] above that of 70 K, the exact inverse of `temperatureAt` (same linear pieces). */
  enthalpyAt(temperature_K: number): number {
    const t = this.temperature;
    if (!(temperature_K >= LOW_K && temperature_K < HIGH_K)) {
      throw new RangeError(`temperature ${temperature_K} K outside 70-1300 K`);
    }
    let low = 0;
    let high = this.size - 1;
    while (high - low > 1) {
      const middle = (low + high) >> 1;
      if (t[middle]! <= temperature_K) low = middle;
      else high = middle;
    }
    return (low + (temperature_K - t[low]!) / (t[high]! - t[low]!)) / this.perStep;
  }
}
