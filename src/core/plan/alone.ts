import type { LimitsDefinition, StoreKind } from '../definitions.js';
import { computeHours } from '../dispatch/hours.js';
import { hoursInput } from '../dispatch/unitHours.js';
import type { EndCause, Quantiles } from '../estimate.js';
import type { StoreTemperatures } from '../machine/machine.js';
import type { UnitModel } from '../unitModel.js';
import type { BedsAhead } from './bedsAhead.js';
import type { LimitRun } from './limitToLimit.js';
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

/** Hours of the unit from now, and of each store alone; see computeHours and `storeAlone`. */
export interface HoursOfEach {
  readonly together: HoursAlone;
  readonly hot: HoursAlone;
  readonly cold: HoursAlone;
}

/** @param usual whose power is meant */
export function hoursOfEach({ models, state, power_W }: Usual): HoursOfEach {
  const hours = (own: Pick<UnitModel, 'unit' | 'machine'>): HoursAlone => {
    const input = hoursInput({ ...models, ...own }, state, power_W);
    const { hours: found, ends_by } = computeHours(input, power_W);
    return { hours: found, ends_by };
  };
  return {
    together: hours(models),
    hot: hours(storeAlone(models, 'hot')),
    cold: hours(storeAlone(models, 'cold')),
  };
}

/**
 * The unit as if one of its stores alone set its end: the other's rule is left out, and the machine is
 * given gas of the other's charged reference, whatever that one lets out.
 */
export function storeAlone<T extends Pick<UnitModel, 'unit' | 'machine'>>(
  model: T,
  kind: StoreKind,
): T {
  const { unit, machine } = model;
  const other = unit.stores.find((store) => store.kind !== kind);
  if (other === undefined) return model;
  const held =
    other.kind === 'hot' ? { hot_K: other.reference_hot_K } : { cold_K: other.reference_cold_K };
  const partner = (outlets: StoreTemperatures): StoreTemperatures => ({ ...outlets, ...held });
  return {
    ...model,
    unit: { ...unit, limits: { ...unit.limits, ...WITHOUT[other.kind] } },
    machine: {
      ...machine,
      operate: (direction, outlets, ambient_K) =>
        machine.operate(direction, partner(outlets), ambient_K),
    },
  };
}

/** Each store run to its own rule alone. */
export function runAlone(usual: Usual, beds: BedsAhead): Record<StoreKind, LimitRun> {
  const run = (kind: StoreKind): LimitRun => toEmpty(usual, beds, storeAlone(usual.model, kind));
  return { hot: run('hot'), cold: run('cold') };
}

/**
 * Mismatch of the two stores in beds as they are [h]: how long the hot one could go on alone less how
 * long the cold one could, with less power where the greatest flow gives less. Above 0 the hot one
 * holds more. Along a discharge it stays the same but for what the outlets' fall changes in the flow,
 * as one flow empties both.
 */
export function mismatchOf(usual: Usual, beds: BedsAhead): number {
  return mismatchBetween(runAlone(usual, beds));
}

export function mismatchBetween({ hot, cold }: Record<StoreKind, LimitRun>): number {
  return hot.hours - cold.hours;
}
