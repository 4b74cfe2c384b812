import { enthalpyAt } from '../../src/core/bed/tables.js';
import type { StoreModel, StoreState } from '../../src/core/track/storeTracker.js';
import { setTubeTemperatures, type TubeState } from '../../src/core/track/tube.js';
import type { SimulatedStore } from '../../test/plant/simulatedStore.js';
import { tubeFlow } from '../../test/plant/tubes.js';

/** How much the estimator is told of what was drawn, so that its own physics can be told apart. */
export interface Told {
  /** Heat capacity (rock and void) by the flow factors; hv and void by the transfer factor. */
  readonly physics: boolean;
}

/** Puts the true temperatures of the rings, averaged per tube, into a store's state. */
export function setTrueState(
  model: StoreModel,
  state: StoreState,
  truth: SimulatedStore,
  told: Told,
): void {
  const { bed } = truth;
  const { cells: fine, shells } = bed.p;
  const cells = model.tubes[0]!.layout.cells;
  const ratio = fine / cells;
  if (!Number.isInteger(ratio)) throw new RangeError(`${fine} cells into ${cells}`);
  // By heat, not by temperature: mean enthalpy of shells and cells, as a temperature.
  const specific = (r: number, i: number): number => {
    let sum = 0;
    for (let n = 0; n < ratio; n++) {
      const k = r * fine + i * ratio + n;
      for (let s = 0; s < shells; s++) sum += bed.enthalpy[k * shells + s]!;
    }
    return sum / (ratio * shells);
  };
  // Ring r lies between these shares of the cross-section.
  const edges = [0];
  for (const share of truth.layout.shares) edges.push(edges[edges.length - 1]! + share);
  /** Mean temperature by heat between two shares of the cross-section, counted from the axis [K]. */
  const between = (from: number, to: number): Float64Array =>
    Float64Array.from({ length: cells }, (_, i) => {
      let heat = 0;
      for (let r = 0; r < bed.c.rings; r++) {
        const overlap = Math.min(to, edges[r + 1]!) - Math.max(from, edges[r]!);
        if (overlap > 0) heat += overlap * specific(r, i);
      }
      return bed.c.rock.temperatureAt(heat / (to - from));
    });
  const solid = (1 - bed.p.void_fraction) / (1 - model.store.bed.void_fraction);
  const capacity = bed.p.heat_capacity_factor * solid;
  const transfer = bed.heatTransferFactor * solid;
  const flows = tubeFlow(bed, truth.layout);
  let inside = 0;
  model.tubes.forEach((tube, k) => {
    const own = state.tubes[k] as TubeState;
    const wall = model.wall?.tube === k ? model.wall : null;
    const outer = inside + tube.string.area_share - (wall?.share ?? 0);
    setTubeTemperatures(tube, own, between(inside, outer));
    inside = outer;
    const s = truth.geometry.strings.findIndex((g) => g.id === tube.string.id);
    const flow = s >= 0 && Number.isFinite(flows[s]) ? flows[s]! : 1;
    own.further[tube.layout.flow - cells] = Math.log(flow / (told.physics ? capacity : 1));
    own.further[tube.layout.transfer - cells] = told.physics ? Math.log(transfer / capacity) : 0;
    if (wall === null || state.wall === null) return;
    wall.layers.forEach((layer, n) => {
      const profile = between(inside, inside + layer.share);
      inside += layer.share;
      for (let i = 0; i < cells; i++) {
        state.wall!.enthalpy[n]![i] = enthalpyAt(model.tables, profile[i]!);
      }
    });
    for (let i = 0; i < cells; i++) {
      let steel = 0;
      for (let n = 0; n < ratio; n++) steel += bed.wall[i * ratio + n]!;
      state.wall.steel_K[i] = steel / ratio;
    }
  });
  state.started = true;
}
