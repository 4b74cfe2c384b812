import type { UnitDefinition } from '../definitions.js';
import type { IndicatorKind } from './indicator.js';
import { indicatorsOf } from './indicators.js';
import { INDICATOR_EVENTS } from './kinds.js';

/** What each kind has one of. */
const ONE_PER: Readonly<Record<IndicatorKind, 'store' | 'string' | 'unit'>> = {
  spread_ratio: 'store',
  heat_transfer: 'store',
  string_flow: 'string',
  front_travel: 'store',
  standing_loss: 'store',
  valve_leak: 'store',
  pressure_drop: 'store',
  plateau: 'store',
  gas_inventory: 'unit',
  settling: 'store',
  store_mismatch: 'unit',
  front_view: 'string',
  energy_lost: 'unit',
  sensor_health: 'store',
};

/** How seldom a healthy unit is called degraded. */
export interface InControl {
  /** Indicators that raise an alert, those that lack an instrument among them. */
  readonly indicators: number;
  /** Mean time to a false decision of one of them, at least [d]. */
  readonly each_d: number;
  /** Of any of them, at least [d]. */
  readonly unit_d: number;
}

/**
 * Bound on the mean time until any indicator of a healthy unit is called degraded: false decisions of
 * the indicators add up, 1/T = sum of 1/T_i, and the bound of each holds for their sum too, also where
 * they hang together (see decisionAt: the sums of all tests, each over its gamma, add up).
 */
export function inControlOf(unit: UnitDefinition): InControl {
  const { in_control_d } = indicatorsOf(unit);
  const strings = unit.stores.reduce((sum, store) => sum + store.strings.length, 0);
  const count = { unit: 1, store: unit.stores.length, string: strings };
  const kinds = Object.keys(INDICATOR_EVENTS) as IndicatorKind[];
  const indicators = kinds.reduce((sum, kind) => sum + count[ONE_PER[kind]], 0);
  return { indicators, each_d: in_control_d, unit_d: in_control_d / indicators };
}
