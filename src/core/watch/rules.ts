import type { IndicatorKind, IndicatorRule, IndicatorsDefinition } from './indicator.js';

const H = 3600;

interface KindNote extends IndicatorRule {
  /** Unit of limit and deadband. */
  readonly unit: string;
  /** What the limit means. */
  readonly words: string;
}

/**
 * Limits as shipped. All are choices, common practice at most: what a site can bear is its own
 * matter. They stand where a loss of some per cent of the dispatchable energy begins.
 */
export const INDICATOR_DEFAULTS: Readonly<Record<IndicatorKind, KindNote>> = {
  spread_ratio: note(1.3, 0.1, '-', 'width of the front over that of the healthy twin', 900, 1800),
  heat_transfer: note(0.7, 0.1, '-', 'heat-transfer factor over the healthy one, at most'),
  string_flow: note(
    0.06,
    0.02,
    '-',
    "share of its part of the bed's flow, off from the healthy one",
  ),
  front_travel: note(
    0.04,
    0.015,
    '-',
    'travel of the front per metered kilogram, off from the healthy one',
  ),
  standing_loss: note(1.6, 0.3, '-', 'heat lost while standing over the healthy loss'),
  valve_leak: note(0.0025, 0.001, '-', 'flow while standing over the greatest discharge flow'),
  pressure_drop: note(1.15, 0.05, '-', 'pressure drop over the healthy one at the same flow'),
  plateau: note(8, 3, 'K', "gas that enters a store, off from the machine's model"),
  gas_inventory: note(0.03, 0.01, '-', 'share of the gas that is lost'),
  settling: note(0.05, 0.02, 'm', 'depth by which the bed has sunk'),
  store_mismatch: note(
    0.1,
    0.03,
    '-',
    'energy that one store has over the other, of the rated energy',
  ),
  front_view: note(3, 1, 'sigma', 'fitted front off from the bed model', 900, 900),
  energy_lost: note(
    0.05,
    0.02,
    '-',
    'dispatchable energy lost to degradation, of the rated energy',
  ),
  sensor_health: note(
    0.2,
    0.05,
    '-',
    'share of the thermocouples of a store that is not believed',
    900,
    1800,
  ),
};

export const INDICATORS_DEFAULT: IndicatorsDefinition = {
  in_control_d: 3000,
  baseline_from_ms: null,
  rules: INDICATOR_DEFAULTS,
};

function note(
  limit: number,
  deadband: number,
  unit: string,
  words: string,
  on_delay_s = 600,
  off_delay_s = 2 * H,
): KindNote {
  return { limit, deadband, unit, words, on_delay_s, off_delay_s };
}
