import type { StoreKind } from '../definitions.js';
import { type HoursAlone, hoursOfEach, mismatchOf, storeAlone } from './alone.js';
import { contentOf } from './content.js';
import { type Trim, trimsOf } from './trim.js';
import { toEmpty, type Usual, usualCharge } from './usual.js';

/** Heat or cold that a store still holds when the other ends the discharge. */
export interface Stranded {
  readonly store: string;
  /** Above its discharged reference then. */
  readonly remains_MWh_th: number;
  /** Of it, what the store alone would give on until its own rule. */
  readonly stranded_MWh_th: number;
  /** What that would give if the other store matched it. */
  readonly worth_MWh_el: number;
}

export interface Drift {
  /** Mismatch after the usual charge of each of two equal cycles [h]. */
  readonly after_charge_h: number[];
  readonly per_cycle_h: number;
  /** Of what is stranded at the end of each cycle's discharge. */
  readonly per_cycle_MWh_th: number;
}

export interface Mismatch {
  readonly power_MW_el: number;
  readonly together: HoursAlone;
  /** Each store as if it alone set the end, by store; see `storeAlone`. */
  readonly alone: Record<string, HoursAlone>;
  /** Hot less cold, by the best march: above 0 the hot store holds more. */
  readonly mismatch_h: number;
  /** The store that ends a discharge; null: they match to a minute. */
  readonly ends_first: string | null;
  readonly stranded: Stranded | null;
  readonly drift: Drift;
  readonly trims: Trim[];
}

/** Closer than this the stores match [h]. */
const MATCH_H = 1 / 60;

/**
 * How the two stores of a unit match, and what that costs.
 *
 * A discharge is marched from now to the first store's rule, and one of the store that holds more as
 * if it were alone (`storeAlone`) to its own: what that one holds less at its end was stranded. It is
 * worth what a discharge of matched stores gives per heat of that store. The drift is that of two usual cycles from now.
 *
 * @returns null for a unit of one store
 */
export function mismatchAnswer(usual: Usual): Mismatch | null {
  const { model, now, power_W } = usual;
  const ids = idsOf(usual);
  if (ids === null) return null;
  const each = hoursOfEach(usual);
  const mismatch_h = mismatchOf(usual, now);
  const more: StoreKind = mismatch_h > 0 ? 'hot' : 'cold';
  const matched = Math.abs(mismatch_h) < MATCH_H;
  const stranded = strandedFrom(usual, now, more);
  return {
    power_MW_el: power_W / 1e6,
    together: each.together,
    alone: { [ids.hot]: each.hot, [ids.cold]: each.cold },
    mismatch_h,
    ends_first: matched ? null : ids[more === 'hot' ? 'cold' : 'hot'],
    stranded: matched ? null : stranded,
    drift: driftOf(usual),
    trims: trimsOf(usual, mismatch_h),
  };

  function strandedFrom(of: Usual, beds: typeof now, kind: StoreKind): Stranded {
    const s = model.stores.findIndex((own) => own.store.kind === kind);
    const first = beds === now ? of.nowEmpty : toEmpty(of, beds);
    const own = toEmpty(of, beds, storeAlone(model, kind));
    const remains = contentOf(model, first.end, of.capacity)[s] as number;
    const given = Math.max(0, remains - (contentOf(model, own.end, of.capacity)[s] as number));
    return {
      store: (model.stores[s] as (typeof model.stores)[number]).store.id,
      remains_MWh_th: remains,
      stranded_MWh_th: given,
      worth_MWh_el: given * (of.perStore[s] as number),
    };
  }

  function driftOf(of: Usual): Drift {
    const after: number[] = [];
    const left: number[] = [];
    let beds = now;
    for (let n = 0; n < 2; n++) {
      const charge = usualCharge(of, beds, n === 0 ? of.firstCharge_J : of.charge_J);
      const m = mismatchOf(of, charge.end);
      after.push(m);
      const { stranded_MWh_th } = strandedFrom(of, charge.end, m > 0 ? 'hot' : 'cold');
      left.push(stranded_MWh_th);
      beds = toEmpty(of, charge.end).end;
    }
    return {
      after_charge_h: after,
      per_cycle_h: (after[1] as number) - (after[0] as number),
      per_cycle_MWh_th: (left[1] as number) - (left[0] as number),
    };
  }
}

/** Ids of the hot and the cold store; null where there is one store. */
function idsOf({ model }: Usual): Record<StoreKind, string> | null {
  const id = (kind: StoreKind): string | undefined =>
    model.stores.find((own) => own.store.kind === kind)?.store.id;
  const hot = id('hot');
  const cold = id('cold');
  return hot === undefined || cold === undefined ? null : { hot, cold };
}
