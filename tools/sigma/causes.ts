import { referenceEnthalpies } from '../../src/core/track/storeEnergy.js';
import type { StoreModel, StoreState } from '../../src/core/track/storeTracker.js';
import type { TubeModel, TubeState } from '../../src/core/track/tube.js';

/** What may err in a tube, by the states that stand for it; `profile` is what they all leave open. */
export const CAUSES = ['offsets', 'places', 'inlets', 'flow', 'transfer', 'share'] as const;
export type Cause = (typeof CAUSES)[number];

/**
 * Variance of a store's state of charge as far as its strings see it, by cause, each cause taken
 * alone and tubes as independent:
 *
 *   v_c = sum_k w_k^2 a_kc' P_cc^-1 a_kc,      a_kc = P_c: e
 *
 * with e the state of charge along the cells. Causes that the readings tie to each other explain the
 * same twice, so that they need not add up to `all`; `profile` is what they do not explain together.
 */
export function seenVariance(
  model: StoreModel,
  state: StoreState,
): Record<Cause | 'profile' | 'all', number> {
  const { charged, discharged } = referenceEnthalpies(model);
  const sums = { offsets: 0, places: 0, inlets: 0, flow: 0, transfer: 0, share: 0 };
  let all = 0;
  let profile = 0;
  model.tubes.forEach((tube, k) => {
    const w = tube.string.area_share ** 2;
    const own = tubeParts(tube, state.tubes[k] as TubeState, charged - discharged);
    for (const cause of CAUSES) sums[cause] += w * own.by[cause];
    all += w * own.all;
    profile += w * own.profile;
  });
  return { ...sums, profile, all };
}

function tubeParts(
  tube: TubeModel,
  state: TubeState,
  span: number,
): { by: Record<Cause, number>; all: number; profile: number } {
  const { layout, tables } = tube;
  const { cells, size } = layout;
  const p = state.covariance;
  const e = Float64Array.from({ length: cells }, (_, i) => {
    const at = Math.floor(state.enthalpy[i]! * tables.inverse_dH);
    const segment = Math.min(tables.segments - 1, Math.max(0, at));
    return tables.heatCapacity[segment]! / (cells * span);
  });
  const along = (row: number): number => {
    let sum = 0;
    for (let i = 0; i < cells; i++) sum += e[i]! * p[row * size + i]!;
    return sum;
  };
  let all = 0;
  for (let i = 0; i < cells; i++) all += e[i]! * along(i);
  const states: Record<Cause, number[]> = {
    offsets: [
      ...Array.from({ length: layout.sensors }, (_, s) => layout.offset + s),
      ...layout.groups.map((_, g) => layout.group + g),
    ],
    places: Array.from({ length: layout.sensors }, (_, s) => layout.position + s),
    inlets: [layout.inlet.charge_inlet, layout.inlet.discharge_inlet],
    flow: [layout.flow],
    transfer: [layout.transfer],
    share: [layout.share],
  };
  const explained = (of: readonly number[]) => explainedBy(p, size, of, of.map(along));
  const by = Object.fromEntries(CAUSES.map((cause) => [cause, explained(states[cause])])) as Record<
    Cause,
    number
  >;
  return { by, all, profile: all - explained(CAUSES.flatMap((cause) => states[cause])) };
}

/** a' P_cc^-1 a by Cholesky; a state whose pivot is lost to round-off explains nothing more. */
function explainedBy(
  p: Float64Array,
  size: number,
  states: readonly number[],
  a: readonly number[],
): number {
  const live = states.map((s, i) => ({ s, a: a[i]! })).filter(({ s }) => p[s * size + s]! > 0);
  const lower = live.map(() => new Float64Array(live.length));
  const solved = new Float64Array(live.length);
  live.forEach(({ s, a: value }, i) => {
    let rest = value;
    let left = p[s * size + s]!;
    for (let j = 0; j < i; j++) {
      let sum = p[s * size + live[j]!.s]!;
      for (let k = 0; k < j; k++) sum -= lower[i]![k]! * lower[j]![k]!;
      const pivot = lower[j]![j]!;
      lower[i]![j] = pivot > 0 ? sum / pivot : 0;
      rest -= lower[i]![j]! * solved[j]!;
      left -= lower[i]![j]! ** 2;
    }
    const pivot = left > 1e-9 * p[s * size + s]! ? Math.sqrt(left) : 0;
    lower[i]![i] = pivot;
    solved[i] = pivot > 0 ? rest / pivot : 0;
  });
  return solved.reduce((sum, v) => sum + v * v, 0);
}
