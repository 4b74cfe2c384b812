import type { LimitsDefinition, StoreKind } from '../definitions.js';
import { computeHours } from '../dispatch/hours.js';
import { hoursInput } from '../dispatch/unitHours.js';
import type { DispatchAnswer, EndCause, Quantiles } from '../estimate.js';
import type { BedsAhead } from './bedsAhead.js';
import { withoutRules } from './limitToLimit.js';
import { toEmpty, type Usual } from './usual.js';

/** Rules of a discharge that leave one kind of store out. */
export const WITHOUT: Readonly<Record<StoreKind, Partial<LimitsDefinition>>> = {
  hot: { hot_outlet_min_K: null },
  cold: { cold_outlet_max_K: null },
};

export interface HoursAlone {
  readonly hours: Quantiles;
  readonly ends_by: EndCause;
}

/** Hours of the unit from now, and of each store where the other's rule is left out; see computeHours. */
export interface HoursOfEach {
  readonly together: HoursAlone;
  readonly hot: HoursAlone;
  readonly cold: HoursAlone;
}

/** @param usual whose power is meant */
export function hoursOfEach({ models, state, power_W }: Usual): HoursOfEach {
  const { unit } = models;
  const hours = (rules: Partial<LimitsDefinition>): HoursAlone => {
    const own = { ...models, unit: { ...unit, limits: { ...unit.limits, ...rules } } };
    const found: DispatchAnswer = computeHours(hoursInput(own, state, power_W), power_W);
    return { hours: found.hours, ends_by: found.ends_by };
  };
  return { together: hours({}), hot: hours(WITHOUT.cold), cold: hours(WITHOUT.hot) };
}

/**
 * Mismatch of the two stores in beds as they are [h]: how long the hot one could go on without the
 * cold one's rule less how long the cold one could without the hot one's, with less power where the
 * greatest flow gives less. Above 0 the hot one holds more. Along a discharge it stays the same, as
 * one flow empties both.
 */
export function mismatchOf(usual: Usual, beds: BedsAhead): number {
  const hours = (rules: Partial<LimitsDefinition>): number =>
    toEmpty(usual, beds, withoutRules(usual.model, rules)).hours;
  return hours(WITHOUT.cold) - hours(WITHOUT.hot);
}
