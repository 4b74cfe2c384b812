import { type BedTables, temperatureAt } from '../bed/tables.js';

/**
 * How far the rock is from the gas at a place, D = Ts - Tg [K]. Gas is quasi-steady (Schumann 1929),
 * the rock's profile straight between cell centres and level in the half cells at both ends:
 *
 *   l dTg/dz = D,   dD/dz = dTs/dz - D/l,   D(0) = Ts(0) - T_in      l = G cf/hv, z along the flow
 *   D(z) = sum_j k_j (T_(j+1) - T_j) + r (T_0 - T_in)                cells counted along the flow
 *
 * with, for a piece of w cells that ends m cells upstream of the place, and n = dx/l,
 *
 *   k = exp(-m n) (1 - exp(-w n))/n,   r = exp(-z/l)
 *
 * In an even slope far from the inlet that is D = l dTs/dz: the gas as warm as the rock one lag
 * upstream. l is taken as it is at the place; it changes by some tenths from end to end of a bed.
 */
export interface GasGap {
  /** D [K] and its derivative with respect to ln l [K]. */
  gap_K: number;
  perLnLag_K: number;
  /** r, the derivative with respect to the temperature of the entering gas with its sign turned. */
  remainder: number;
  /** Lowest and highest cell that D was taken from. */
  from: number;
  to: number;
}

/** What lies upstream of where so much is left of a gap is left out. */
const CUT = 3e-4;

/**
 * D at a place into `out`; `factor` times its derivatives with respect to the cells is added to
 * `weights` (one per cell).
 *
 * @param enthalpy of the cells [J/m3 of bed]
 * @param place_m distance from the charge inlet [m]
 * @param lag_m G cf/hv [m], + = the gas comes from cell 0, never 0: standing gas is as its rock
 * @param inlet_K temperature of the entering gas; NaN = unknown, as warm as the first rock
 * @throws RangeError for a lag of 0 or none
 */
export function gasGap(
  tables: BedTables,
  enthalpy: Float64Array,
  place_m: number,
  lag_m: number,
  inlet_K: number,
  factor: number,
  weights: Float64Array,
  out: GasGap,
): void {
  if (!(Math.abs(lag_m) > 0)) throw new RangeError(`lag_m ${lag_m}: expected other than 0`);
  const cells = enthalpy.length;
  const { length_m } = tables.bed;
  const along = lag_m > 0 ? 1 : -1;
  const first = along > 0 ? 0 : cells - 1;
  const dx = length_m / cells;
  const n = dx / Math.abs(lag_m);
  const z = Math.min(cells, Math.max(0, (along > 0 ? place_m : length_m - place_m) / dx));
  // The piece that the place lies in, cut off there, then whole ones upstream to the first centre.
  let j = Math.min(cells - 2, Math.floor(z - 0.5));
  let behind = Math.max(0, z - (cells - 0.5));
  let width = Math.min(1, z - 0.5 - j);
  let left = behind > 0 ? Math.exp(-behind * n) : 1;
  const whole = Math.exp(-n);
  let upper = first + along * Math.max(0, j + 1);
  let upper_K = temperatureAt(tables, enthalpy[upper] as number);
  let gap = 0;
  let perLnLag = 0;
  const nearest = upper;
  for (; j >= 0 && left > CUT; j--) {
    const through = width === 1 ? whole : Math.exp(-width * n);
    const k = (left * (1 - through)) / n;
    const lower = upper - along;
    const lower_K = temperatureAt(tables, enthalpy[lower] as number);
    const step_K = upper_K - lower_K;
    gap += k * step_K;
    perLnLag += step_K * (k * (1 + behind * n) - left * through * width);
    weights[upper] = (weights[upper] as number) + factor * k;
    weights[lower] = (weights[lower] as number) - factor * k;
    left *= through;
    behind += width;
    width = 1;
    upper = lower;
    upper_K = lower_K;
  }
  out.remainder = 0;
  if (j < 0 && left > CUT && Number.isFinite(inlet_K)) {
    const r = Math.exp(-z * n);
    const entering_K = upper_K - inlet_K;
    gap += r * entering_K;
    perLnLag += r * z * n * entering_K;
    weights[upper] = (weights[upper] as number) + factor * r;
    out.remainder = r;
  }
  out.gap_K = gap;
  out.perLnLag_K = perLnLag;
  out.from = Math.min(nearest, upper);
  out.to = Math.max(nearest, upper);
}
