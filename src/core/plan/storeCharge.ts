import type { RolloutStore } from '../dispatch/rollout.js';
import { referenceEnthalpies } from '../track/storeEnergy.js';
import type { StoreModel } from '../track/storeTracker.js';
import type { BedsAhead } from './bedsAhead.js';

/**
 * State of charge of each store [-]: enthalpy above the discharged reference over that between the
 * references, by area; not clamped (see storeEnergy).
 *
 * @param stores streams whose beds `ahead` holds, in the order of `models`
 */
export function chargesOf(
  models: readonly StoreModel[],
  stores: readonly RolloutStore[],
  ahead: BedsAhead,
): number[] {
  return models.map((model, s) => {
    const { charged, discharged } = referenceEnthalpies(model);
    const beds = ahead.beds[s] as readonly Float64Array[];
    return (stores[s] as RolloutStore).tubes.reduce((all, tube, k) => {
      const bed = beds[k] as Float64Array;
      let sum = 0;
      for (const h of bed) sum += h - discharged;
      return all + (tube.area_share * sum) / (bed.length * (charged - discharged));
    }, 0);
  });
}

/** States of charge at given times, taken down while a march goes by. */
export interface ChargeRecord {
  readonly each: (t_s: number, ahead: BedsAhead) => void;
  /** By time and store; NaN before the march has come there. */
  readonly charges: readonly number[][];
}

/** Steps end within this of the times they are meant to [s]. */
const SAME_S = 1e-3;

/** @param times_s ascending, above 0; between two steps by a straight line */
export function chargeRecord(
  models: readonly StoreModel[],
  stores: readonly RolloutStore[],
  times_s: readonly number[],
): ChargeRecord {
  const charges = times_s.map(() => models.map(() => Number.NaN));
  let next = 0;
  let before: { readonly t_s: number; readonly at: readonly number[] } | null = null;
  const each = (t_s: number, ahead: BedsAhead): void => {
    if (next >= times_s.length) return;
    const at = chargesOf(models, stores, ahead);
    while (next < times_s.length && (times_s[next] as number) <= t_s + SAME_S) {
      const last = before;
      const span = last === null ? 0 : t_s - last.t_s;
      const share = span > 0 ? (t_s - (times_s[next] as number)) / span : 0;
      charges[next] = at.map((value, s) => {
        const back = (last?.at[s] ?? value) - value;
        return value + back * Math.min(1, Math.max(0, share));
      });
      next++;
    }
    before = { t_s, at };
  };
  return { each, charges };
}
