import type { SensorVerdict } from '../../../core/estimate.js';
import type { IndicatorKind, IndicatorReason } from '../../../core/watch/indicator.js';

/** Names of what is watched, short enough for a row. */
export const KIND_WORDS: Readonly<Record<IndicatorKind, string>> = {
  spread_ratio: 'Spread ratio',
  heat_transfer: 'Heat-transfer factor',
  string_flow: 'Share of the flow',
  front_travel: 'Front travel per kg',
  standing_loss: 'Standing loss',
  valve_leak: 'Valve leak',
  pressure_drop: 'Pressure drop',
  plateau: 'Plateau temperature',
  gas_inventory: 'Gas lost',
  settling: 'Settling of the bed',
  store_mismatch: 'Mismatch of the stores',
  front_view: 'Front view',
  energy_lost: 'Energy lost to degraded beds',
  sensor_health: 'Thermocouples not believed',
};

export const REASON_WORDS: Readonly<Record<IndicatorReason, string>> = {
  not_instrumented: 'no instrument tells it',
  learning: 'healthy value still being learned',
  not_exercised: 'the plant has not yet done what shows it',
  too_uncertain: 'the readings leave it open',
};

export const VERDICT_WORDS: Readonly<Record<SensorVerdict, string>> = {
  open: 'no reading',
  burst: 'beyond what can be',
  stuck: 'stuck',
  drifting: 'drifting',
  offset: 'off by a constant',
  reversed: 'reversed polarity',
  swapped: 'swapped with another',
  wrong_type: 'wrong type',
  outlier: 'wild now and then',
  group_fault: 'off with its group',
  uncovered: 'in gas, not in rock',
};

/** `hot/axis` -> `string axis`; '' for a whole store or unit, which stands above the row. */
export function partOf(subject: string): string {
  const [, string] = subject.split('/');
  return string === undefined ? '' : `string ${string}`;
}

/** Where a subject is, in full: `store hot, string axis`. */
export function placeOf(subject: string, unit: string): string {
  if (subject === unit) return 'the unit';
  const string = partOf(subject);
  return `store ${subject.split('/')[0]}${string === '' ? '' : `, ${string}`}`;
}
