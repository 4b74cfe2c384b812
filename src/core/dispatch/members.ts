import { storeEnergy } from '../track/storeEnergy.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';
import type { TubeState } from '../track/tube.js';
import type { HoursInput } from './hours.js';
import type { Member } from './roller.js';

/** Slopes of one figure along all that is uncertain: by store and tube, along the cells [1/K]. */
export interface Slopes {
  readonly cells: readonly (readonly Float64Array[])[];
  /** By store, per ln of the flow factor; per ln of the work factor. */
  readonly flow: readonly number[];
  readonly work: number;
}

/**
 * A figure's sigma, and the likeliest plant in which it lies `sigmas` of it away: with g its slopes
 * and P what filter and calibration say,
 *
 *   sigma = sqrt(g'P g),     x = P g sigmas/sigma
 *
 * Where a figure that decides follows the plant without a turn, what happens to that plant happens
 * with the same probability as the figure lies beyond. Flow and work are those of the calibration; a
 * tube's profile moves along with its flow, and else by what P leaves open of it. What tubes share and
 * what no string sees widens it as it widens the state of charge.
 */
export function memberAt(
  input: HoursInput,
  slopes: Slopes,
): { sigma: number; at: (sigmas: number) => Member } {
  const parts = input.models.map((model, s) =>
    storePart(model, input.states[s] as StoreState, slopes.cells[s] as Float64Array[]),
  );
  const factors = [...parts.map((part, s) => (slopes.flow[s] as number) + part.flow), slopes.work];
  const along = factors.map((_, i) => {
    const row = input.calibration?.covariance[i];
    return row === undefined ? 0 : factors.reduce((sum, f, j) => sum + f * (row[j] as number), 0);
  });
  const variance =
    factors.reduce((sum, f, i) => sum + f * (along[i] as number), 0) +
    parts.reduce((sum, part) => sum + part.variance, 0);
  const sigma = Math.sqrt(Math.max(0, variance));
  const at = (sigmas: number): Member => {
    const by = sigma > 0 ? sigmas / sigma : 0;
    return {
      shifts_K: parts.map((part, s) =>
        part.tubes.map(({ own, withFlow }) =>
          own.map((v, i) => by * (v + (withFlow[i] as number) * (along[s] as number))),
        ),
      ),
      flow: along.slice(0, -1).map((v) => by * v),
      work: by * (along[along.length - 1] as number),
    };
  };
  return { sigma, at };
}

interface StorePart {
  /** What moves along with ln(flow factor), and the variance that the profile has besides. */
  readonly flow: number;
  readonly variance: number;
  /** Per tube P g without what the flow explains, and P_f/P_ff [K per ln]. */
  readonly tubes: readonly { readonly own: Float64Array; readonly withFlow: Float64Array }[];
}

function storePart(
  model: StoreModel,
  state: StoreState,
  gradients: readonly Float64Array[],
): StorePart {
  const { soc_sigma, unseen, shared_over_independent } = storeEnergy(model, state);
  const seen = soc_sigma ** 2 - unseen ** 2;
  const wider =
    (model.tubes.length === 1 ? 1 : shared_over_independent) *
    (seen > 0 ? soc_sigma ** 2 / seen : 1);
  let flow = 0;
  let variance = 0;
  const tubes = model.tubes.map((tube, k) => {
    const { cells, size, flow: f } = tube.layout;
    const p = (state.tubes[k] as TubeState).covariance;
    const g = gradients[k] as Float64Array;
    const v = p[f * size + f] as number;
    const withFlow = Float64Array.from({ length: cells }, (_, i) =>
      v > 0 ? (p[f * size + i] as number) / v : 0,
    );
    const tied = g.reduce((sum, a, i) => sum + a * (withFlow[i] as number), 0);
    const own = new Float64Array(cells);
    for (let i = 0; i < cells; i++) {
      let sum = 0;
      for (let j = 0; j < cells; j++) sum += (p[i * size + j] as number) * (g[j] as number);
      own[i] = (sum - v * (withFlow[i] as number) * tied) * wider;
    }
    flow += tied;
    variance += g.reduce((sum, a, i) => sum + a * (own[i] as number), 0);
    return { own, withFlow };
  });
  return { flow, variance, tubes };
}
