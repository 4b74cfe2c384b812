import { referenceEnthalpies } from '../track/storeEnergy.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';
import type { TubeModel, TubeState } from '../track/tube.js';

/**
 * How much of the variance of a store's state of charge lasts over a run [-]: what the offsets of its
 * thermocouples, of their groups and of the inlets explain. These stay for a day and more, so that
 * they are the same ones at the run's end, less what was learned of them meanwhile:
 *
 *   share = sum_k w_k^2 a_k' P_oo^-1 a_k / sum_k w_k^2 e'P e,      a_k = P_o: e
 *
 * with e the state of charge along the cells. Errors of place and of the profile turn with the front
 * and are not counted.
 */
export function lastingShare(model: StoreModel, state: StoreState): number {
  const { charged, discharged } = referenceEnthalpies(model);
  let explained = 0;
  let all = 0;
  model.tubes.forEach((tube, k) => {
    const own = state.tubes[k] as TubeState;
    const w = tube.string.area_share ** 2;
    const { variance, lasting } = parts(tube, own, charged - discharged);
    all += w * variance;
    explained += w * lasting;
  });
  return all > 0 ? Math.min(1, Math.max(0, explained / all)) : 0;
}

function parts(
  tube: TubeModel,
  state: TubeState,
  span: number,
): { variance: number; lasting: number } {
  const { layout, tables } = tube;
  const { cells, size } = layout;
  const p = state.covariance;
  const e = new Float64Array(cells);
  for (let i = 0; i < cells; i++) {
    const at = Math.floor((state.enthalpy[i] as number) * tables.inverse_dH);
    const segment = Math.min(tables.segments - 1, Math.max(0, at));
    e[i] = (tables.heatCapacity[segment] as number) / (cells * span);
  }
  const along = (row: number): number => {
    let sum = 0;
    for (let i = 0; i < cells; i++) sum += (e[i] as number) * (p[row * size + i] as number);
    return sum;
  };
  let variance = 0;
  for (let i = 0; i < cells; i++) variance += (e[i] as number) * along(i);
  const causes = [
    layout.inlet.charge_inlet,
    layout.inlet.discharge_inlet,
    ...Array.from({ length: layout.sensors }, (_, s) => layout.offset + s),
    ...layout.groups.map((_, g) => layout.group + g),
  ].filter((c) => (p[c * size + c] as number) > 0);
  return { variance, lasting: explainedBy(p, size, causes, causes.map(along)) };
}

/** a' P_cc^-1 a by Cholesky; a cause whose pivot is lost to round-off explains nothing more. */
function explainedBy(
  p: Float64Array,
  size: number,
  causes: readonly number[],
  a: readonly number[],
): number {
  const n = causes.length;
  const lower = new Float64Array(n * n);
  const solved = new Float64Array(n);
  let sum = 0;
  for (let i = 0; i < n; i++) {
    let rest = a[i] as number;
    for (let j = 0; j < i; j++) {
      let value = p[(causes[i] as number) * size + (causes[j] as number)] as number;
      for (let k = 0; k < j; k++) {
        value -= (lower[i * n + k] as number) * (lower[j * n + k] as number);
      }
      const pivot = lower[j * n + j] as number;
      lower[i * n + j] = pivot > 0 ? value / pivot : 0;
      rest -= (lower[i * n + j] as number) * (solved[j] as number);
    }
    const own = p[(causes[i] as number) * size + (causes[i] as number)] as number;
    let left = own;
    for (let k = 0; k < i; k++) left -= (lower[i * n + k] as number) ** 2;
    const pivot = left > LOST * own ? Math.sqrt(left) : 0;
    lower[i * n + i] = pivot;
    solved[i] = pivot > 0 ? rest / pivot : 0;
    sum += (solved[i] as number) ** 2;
  }
  return sum;
}

/** A variance of which less than this share is left is rounding. */
const LOST = 1e-9;
