import type { UnitDefinition } from '../definitions.js';
import { type Ageing, ageViews, startAgeing } from './ageing.js';
import {
  INDICATOR_KINDS,
  type Indicator,
  type IndicatorInput,
  type IndicatorKind,
  type IndicatorsDefinition,
  type IndicatorView,
} from './indicator.js';
import { AGREEMENT } from './indicators/agreement.js';
import { ENERGY_LOST } from './indicators/energyLost.js';
import { FRONT_TRAVEL } from './indicators/frontTravel.js';
import { GAS_INVENTORY } from './indicators/gasInventory.js';
import { HEAT_TRANSFER } from './indicators/heatTransfer.js';
import { PLATEAU } from './indicators/plateau.js';
import { PRESSURE_DROP } from './indicators/pressureDrop.js';
import { SENSOR_HEALTH } from './indicators/sensorHealth.js';
import { SETTLING } from './indicators/settling.js';
import { SPREAD } from './indicators/spread.js';
import { STANDING_LOSS } from './indicators/standingLoss.js';
import { STORE_MISMATCH } from './indicators/storeMismatch.js';
import { STRING_FLOW } from './indicators/stringFlow.js';
import { VALVE_LEAK } from './indicators/valveLeak.js';
import { INDICATORS_DEFAULT } from './rules.js';

const ALL: readonly Indicator<unknown>[] = [
  SPREAD,
  HEAT_TRANSFER,
  STRING_FLOW,
  FRONT_TRAVEL,
  AGREEMENT,
  ENERGY_LOST,
  SENSOR_HEALTH,
  STANDING_LOSS,
  VALVE_LEAK,
  PRESSURE_DROP,
  PLATEAU,
  GAS_INVENTORY,
  SETTLING,
  STORE_MISMATCH,
];

const placeOf = ({ kind }: Indicator<unknown>): number => INDICATOR_KINDS.indexOf(kind);

/** Every indicator, in the order of INDICATOR_KINDS, in which they are shown. */
export const INDICATORS: readonly Indicator<unknown>[] = ALL.toSorted(
  (a, b) => placeOf(a) - placeOf(b),
);

/**
 * Counts up where the state of an indicator changes its shape: states of another version are begun
 * anew, baselines included, and the rest of the checkpoint is kept.
 */
export const INDICATORS_VERSION = 4;

/** State of each indicator by kind, made when it is first stepped, and how old their values are. Plain, bounded. */
export type IndicatorStates = Partial<Record<IndicatorKind, unknown>> & { ageing?: Ageing };

const shipped = new WeakMap<UnitDefinition, IndicatorsDefinition>();

/** How a unit's indicators decide: as configured, else as shipped; the spread ratio has its own block. */
export function indicatorsOf(unit: UnitDefinition): IndicatorsDefinition {
  if (unit.watch.indicators !== undefined) return unit.watch.indicators;
  const known = shipped.get(unit);
  if (known !== undefined) return known;
  const { rules, ...rest } = INDICATORS_DEFAULT;
  const made = { ...rest, rules: { ...rules, spread_ratio: unit.watch.spread_ratio } };
  shipped.set(unit, made);
  return made;
}

/**
 * Steps all indicators over one scan; a `normal` that rests on nothing new is left open (ageViews).
 *
 * @param states changed in place
 * @returns the views of all subjects, in the order of `INDICATORS`
 */
export function stepIndicators(states: IndicatorStates, input: IndicatorInput): IndicatorView[] {
  const watching = indicatorsOf(input.unit);
  const views = INDICATORS.flatMap((indicator) => {
    states[indicator.kind] ??= indicator.start(input.model);
    const rule = watching.rules[indicator.kind];
    return indicator.step(states[indicator.kind], rule, watching, input);
  });
  states.ageing ??= startAgeing();
  const { mode } = input.taken.conditions;
  return ageViews(states.ageing, views, { mode, time_ms: input.time_ms, dt_s: input.dt_s });
}
