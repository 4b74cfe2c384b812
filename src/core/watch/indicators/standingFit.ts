import { backward, choleskyInPlace, forward } from '../../tune/linear.js';

/** One thermocouple's change over a rest against the standing model. */
export interface RestReading {
  /** Reading's change less the model's [K]. */
  readonly off_K: number;
  /** What a loss twice as large through the mantle, or through both ends, makes of it [K]. */
  readonly mantle_K: number;
  readonly ends_K: number;
  /** Per unit of ln conductivity [K]. */
  readonly conductivity_K: number;
  /** dT/dx there at first, that of the front, and its change since [K/m]; what the model has moved it by [K]. */
  readonly slope_K_m: number;
  readonly bent_K_m: number;
  readonly moved_K: number;
  readonly string: number;
  /** Card or cold junction that it shares; null = none. */
  readonly group: string | null;
}

export interface RestPriors {
  /** Swing of a card between two times of a day [K]. */
  readonly group_K: number;
  /** White noise of a mean over an hour, model and gain errors included [K]. */
  readonly noise_K: number;
}

/** One sigma each: way of the front [m] alike for all strings (a leak), and of one alone. */
const LEAK_WAY_M = 0.3;
const STRING_WAY_M = 0.03;
/** Of one thermocouple: how well the model knows the front's shape there [m]. */
const SHAPE_M = 0.05;
/** Of its place: a constant error shows in what the slope has changed by [m]. */
const PLACE_M = 0.01;
/** Share of its own movement that the model may err by. */
const MOVED_SHARE = 0.15;
/** ln of the bed's conductivity, and how far ends may lose otherwise than the mantle, of the loss. */
const CONDUCTIVITY_SIGMA = 0.2;
const ENDS_SIGMA = 0.3;

/**
 * Excess loss e = (loss - configured)/configured of a store from one rest, by weighted least squares
 * with priors:
 *
 *   y_j = e (M_j + E_j) + d E_j + k C_j + (w + w_s) T'_j + g + noise
 *
 * y_j what a reading moved by less the model, M and E what doubled losses of mantle and ends change,
 * C conductivity, T' the slope, d, k, w, w_s, g what else may be behind it: ends that lose otherwise,
 * conductivity, fronts moved on by a leak, of all strings and of one, a card's swing. None of these
 * is told; they take from e what is not its own.
 *
 * @returns e and its sigma; the part of it that is new in each rest, in which conductivity, shape and
 *   ends stay as they are; and the mean square of what is left over its noise
 */
export function fitRest(
  readings: readonly RestReading[],
  priors: RestPriors,
): { excess: number; sigma: number; fresh: number; misfit: number } {
  const groups = [...new Set(readings.flatMap(({ group }) => (group === null ? [] : [group])))];
  const strings = [...new Set(readings.map(({ string }) => string))];
  // The excess last, so that its sigma is the last pivot's inverse.
  const n = 3 + strings.length + groups.length + 1;
  const e = n - 1;
  const normal = new Float64Array(n * n);
  const right = new Float64Array(n);
  const prior = [ENDS_SIGMA, CONDUCTIVITY_SIGMA, LEAK_WAY_M];
  for (const _ of strings) prior.push(STRING_WAY_M);
  for (const _ of groups) prior.push(priors.group_K);
  prior.forEach((sigma, i) => {
    normal[i * n + i] = sigma ** -2;
  });
  // All but no prior on the excess itself.
  normal[e * n + e] = 1e-6;
  const rows = readings.map((r) => {
    const row = new Float64Array(n);
    row[0] = r.ends_K;
    row[1] = r.conductivity_K;
    row[2] = r.slope_K_m;
    row[3 + strings.indexOf(r.string)] = r.slope_K_m;
    if (r.group !== null) row[3 + strings.length + groups.indexOf(r.group)] = 1;
    row[e] = r.mantle_K + r.ends_K;
    const fresh = Math.hypot(priors.noise_K, SHAPE_M * r.slope_K_m, PLACE_M * r.bent_K_m);
    const weight = 1 / (fresh ** 2 + (MOVED_SHARE * r.moved_K) ** 2);
    return { row, weight, fresh, y: r.off_K };
  });
  for (const { row, weight, y } of rows) {
    for (let i = 0; i < n; i++) {
      right[i] = (right[i] as number) + weight * (row[i] as number) * y;
      for (let j = 0; j <= i; j++) {
        normal[i * n + j] =
          (normal[i * n + j] as number) + weight * (row[i] as number) * (row[j] as number);
      }
    }
  }
  choleskyInPlace(normal, n);
  const x = right.slice();
  forward(normal, n, x);
  const pivot = normal[e * n + e] as number;
  const excess = (x[e] as number) / pivot;
  const all = x.slice();
  backward(normal, n, all);
  let misfit = 0;
  // The estimate is linear in the readings, e = sum a_j y_j, with a = w X z, z the row of the inverse.
  const z = new Float64Array(n);
  z[e] = 1 / pivot;
  backward(normal, n, z);
  const reach = new Float64Array(n);
  let fresh = 0;
  for (const { row, weight, y, fresh: own } of rows) {
    let left = y;
    let a = 0;
    for (let i = 0; i < n; i++) {
      left -= (row[i] as number) * (all[i] as number);
      a += weight * (row[i] as number) * (z[i] as number);
    }
    misfit += weight * left * left;
    fresh += (a * own) ** 2;
    for (let i = 2; i < e; i++) reach[i] = (reach[i] as number) + a * (row[i] as number);
  }
  for (let i = 2; i < e; i++) fresh += ((reach[i] as number) * (prior[i] as number)) ** 2;
  return {
    excess,
    sigma: 1 / pivot,
    fresh: Math.sqrt(fresh),
    misfit: rows.length > 0 ? misfit / rows.length : 0,
  };
}
