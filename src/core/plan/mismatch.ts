import type { StoreKind } from '../definitions.js';
import { type HoursAlone, hoursOfEach, mismatchBetween, runAlone } from './alone.js';
import { contentOf } from './content.js';
import type { LimitRun } from './limitToLimit.js';
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
  /** Of what is stranded in the store that holds more, at the end of each cycle's discharge. */
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
  const { now, power_W, nowEmpty } = usual;
  const ids = idsOf(usual);
  if (ids === null) return null;
  const each = hoursOfEach(usual);
  const alone = runAlone(usual, now);
  const mismatch_h = mismatchBetween(alone);
  const more = holdsMore(mismatch_h);
  const matched = Math.abs(mismatch_h) < MATCH_H;
  return {
    power_MW_el: power_W / 1e6,
    together: each.together,
    alone: { [ids.hot]: each.hot, [ids.cold]: each.cold },
    mismatch_h,
    ends_first: matched ? null : ids[more === 'hot' ? 'cold' : 'hot'],
    stranded: matched ? null : strandedBetween(usual, nowEmpty, alone[more], more),
    drift: driftOf(usual),
    trims: trimsOf(usual, mismatch_h),
  };
}

const holdsMore = (mismatch_h: number): StoreKind => (mismatch_h > 0 ? 'hot' : 'cold');

/** What a store still holds at the end of both, and holds less at the end of its own. */
function strandedBetween(usual: Usual, both: LimitRun, own: LimitRun, kind: StoreKind): Stranded {
  const { model, capacity, perStore } = usual;
  const s = model.stores.findIndex(({ store }) => store.kind === kind);
  const held = ({ end }: LimitRun): number => contentOf(model, end, capacity)[s] as number;
  const stranded_MWh_th = Math.max(0, held(both) - held(own));
  return {
    store: (model.stores[s] as (typeof model.stores)[number]).store.id,
    remains_MWh_th: held(both),
    stranded_MWh_th,
    worth_MWh_el: stranded_MWh_th * (perStore[s] as number),
  };
}

function driftOf(usual: Usual): Drift {
  const after: number[] = [];
  const left: number[] = [];
  let beds = usual.now;
  let kind: StoreKind | null = null;
  for (let n = 0; n < 2; n++) {
    const charge = usualCharge(usual, beds, n === 0 ? usual.firstCharge_J : usual.charge_J);
    const alone = runAlone(usual, charge.end);
    const both = toEmpty(usual, charge.end);
    after.push(mismatchBetween(alone));
    // Of the same store both times: heat is not compared with cold.
    kind ??= holdsMore(mismatchBetween(alone));
    left.push(strandedBetween(usual, both, alone[kind], kind).stranded_MWh_th);
    beds = both.end;
  }
  return {
    after_charge_h: after,
    per_cycle_h: (after[1] as number) - (after[0] as number),
    per_cycle_MWh_th: (left[1] as number) - (left[0] as number),
  };
}

/** Ids of the hot and the cold store; null where there is one store. */
function idsOf({ model }: Usual): Record<StoreKind, string> | null {
  const id = (kind: StoreKind): string | undefined =>
    model.stores.find((own) => own.store.kind === kind)?.store.id;
  const hot = id('hot');
  const cold = id('cold');
  return hot === undefined || cold === undefined ? null : { hot, cold };
}
