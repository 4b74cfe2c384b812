import type { PlantChange, StoreChange } from './faults.js';
import type { SimulatedStore } from './simulatedStore.js';

/** Where a change stands. */
interface ChangeMoment {
  /** It takes effect in this step for the first time. */
  readonly first: boolean;
  /** Heat-transfer factor when it began, and as drawn. */
  readonly from: number;
  readonly drawn: number;
  readonly since_s: number;
}

/** Share of a change that has come about, 0..1; all of it at once without `ramp_s`. */
const shareOf = (since_s: number, ramp_s = 0): number =>
  Math.min(1, since_s / Math.max(ramp_s, 1e-9));

/** Brings a change of a store about, step by step; a leak is no state of it, see `MachineRoom`. */
export function applyChange(store: SimulatedStore, change: StoreChange, at: ChangeMoment): void {
  switch (change.kind) {
    case 'leak':
      return;
    case 'channelling':
      if (at.first) store.channel(change.string, change.factor);
      return;
    case 'settled':
      store.thermocouples.uncovered_m = change.depth_m;
      return;
    case 'heat_transfer': {
      const to = change.factor * at.drawn;
      store.bed.heatTransferFactor = at.from * (to / at.from) ** shareOf(at.since_s, change.ramp_s);
      return;
    }
    case 'insulation':
      store.bed.lossFactor = change.factor;
      return;
    case 'pressure_drop':
      store.dropFactor = change.factor;
      store.dropBelow_K = change.below_K ?? Number.POSITIVE_INFINITY;
      return;
    case 'gas_loss':
      store.gasShare = 1 - change.share * shareOf(at.since_s, change.ramp_s);
      return;
  }
}

/** What the weather adds to the ambient temperature of the draw [K]. */
export function weatherOffset_K(changes: readonly PlantChange[], elapsed_s: number): number {
  let sum = 0;
  for (const change of changes) {
    if (change.kind !== 'weather' || elapsed_s < change.at_s) continue;
    sum += change.offset_K * shareOf(elapsed_s - change.at_s, change.ramp_s);
  }
  return sum;
}
