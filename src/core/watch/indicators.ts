import type { UnitDefinition } from '../definitions.js';
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
import { HEAT_TRANSFER } from './indicators/heatTransfer.js';
import { SENSOR_HEALTH } from './indicators/sensorHealth.js';
import { SPREAD } from './indicators/spread.js';
import { STRING_FLOW } from './indicators/stringFlow.js';
import { INDICATORS_DEFAULT } from './rules.js';

const ALL: readonly Indicator<unknown>[] = [
  SPREAD,
  HEAT_TRANSFER,
  STRING_FLOW,
  FRONT_TRAVEL,
  AGREEMENT,
  ENERGY_LOST,
  SENSOR_HEALTH,
];

const placeOf = ({ kind }: Indicator<unknown>): number => INDICATOR_KINDS.indexOf(kind);

/** Every indicator, in the order of INDICATOR_KINDS, in which they are shown. */
export const INDICATORS: readonly Indicator<unknown>[] = ALL.toSorted(
  (a, b) => placeOf(a) - placeOf(b),
);

/** State of each indicator by kind, made when it is first stepped. Plain and bounded. */
export type IndicatorStates = Partial<Record<IndicatorKind, unknown>>;

/** How a unit's indicators decide: as configured, else as shipped; the spread ratio has its own block. */
export function indicatorsOf({ watch }: UnitDefinition): IndicatorsDefinition {
  if (watch.indicators !== undefined) return watch.indicators;
  const { rules, ...rest } = INDICATORS_DEFAULT;
  return { ...rest, rules: { ...rules, spread_ratio: watch.spread_ratio } };
}

/**
 * Steps all indicators over one scan.
 *
 * @param states changed in place
 * @returns the views of all subjects, in the order of `INDICATORS`
 */
export function stepIndicators(states: IndicatorStates, input: IndicatorInput): IndicatorView[] {
  const watching = indicatorsOf(input.unit);
  return INDICATORS.flatMap((indicator) => {
    states[indicator.kind] ??= indicator.start(input.model);
    const rule = watching.rules[indicator.kind];
    return indicator.step(states[indicator.kind], rule, watching, input);
  });
}
