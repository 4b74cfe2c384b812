import type { UnitDefinition } from '../definitions.js';
import type {
  Indicator,
  IndicatorInput,
  IndicatorKind,
  IndicatorsDefinition,
  IndicatorView,
} from './indicator.js';
import { INDICATORS_DEFAULT } from './rules.js';

/** Every indicator, in the order in which they are shown. */
export const INDICATORS: readonly Indicator<unknown>[] = [];

/** State of each indicator by kind, made when it is first stepped. Plain and bounded. */
export type IndicatorStates = Partial<Record<IndicatorKind, unknown>>;

/** How a unit's indicators decide: as configured, else as shipped. */
export function indicatorsOf(unit: UnitDefinition): IndicatorsDefinition {
  return unit.watch.indicators ?? INDICATORS_DEFAULT;
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
