import type { PlanContext } from './context.js';
import { type FlushAnswer, flushOf, type Prices } from './flush.js';
import { type Mismatch, mismatchAnswer } from './mismatch.js';
import {
  type RunFigures,
  runFigures,
  type USUAL_CHARGES,
  type UsualAsk,
  usualCycle,
} from './usual.js';

export interface BalanceAsk extends UsualAsk {
  /** Absent: figures in MWh_el alone. */
  readonly prices?: Prices;
}

export const ONE_STORE = 'no mismatch: one store';

/** What a flush of the fronts would win back, and how the stores match; see flushOf, mismatchAnswer. */
export interface Balance {
  readonly usual: {
    /** Taken per usual charge, unless a rule ends it before. */
    readonly charge_MWh_el: number;
    readonly charge_from: (typeof USUAL_CHARGES)[number];
    readonly charging_MW_el: number;
    readonly discharging_MW_el: number;
    /** From limit to limit, after a full charge from now. */
    readonly full_charge: RunFigures;
    readonly full_discharge: RunFigures;
    readonly round_trip: number;
    /** The present beds can neither be charged nor discharged: this cycle is that of the model. */
    readonly locked: boolean;
  };
  readonly flush: FlushAnswer;
  readonly mismatch: Mismatch | null;
  /** Why there is none; null: there are two stores. */
  readonly mismatch_reason: string | null;
}

/**
 * @throws RangeError for a price that is not finite, or of energy given below 0; see usualCycle
 */
export function balanceOf(context: PlanContext, ask: BalanceAsk): Balance {
  for (const [name, price] of Object.entries(ask.prices ?? {})) {
    // Who takes energy at a price below 0 is paid for it.
    const any = name === 'charging_price_per_MWh_el';
    if (Number.isFinite(price) && (any || price >= 0)) continue;
    throw new RangeError(`${name} = ${price}: expected a finite number${any ? '' : ', 0 or more'}`);
  }
  const usual = usualCycle(context, ask);
  const mismatch = mismatchAnswer(usual);
  return {
    usual: {
      charge_MWh_el: usual.charge_J / 3.6e9,
      charge_from: usual.charge_from,
      charging_MW_el: usual.charging_W / 1e6,
      discharging_MW_el: usual.power_W / 1e6,
      full_charge: runFigures(usual.nextFull),
      full_discharge: runFigures(usual.nextEmpty),
      round_trip: usual.round_trip,
      locked: usual.locked,
    },
    flush: flushOf(usual, ask.prices ?? null),
    mismatch,
    mismatch_reason: mismatch === null ? ONE_STORE : null,
  };
}
