import type { UnitDefinition } from '../../../core/definitions.js';
import type { DispatchAnswer, Estimate } from '../../../core/estimate.js';
import type { AlarmsMessage } from '../announcer.js';
import { DATATYPE } from './values.js';

/** The newest of what a unit tells; null before the first. */
export interface DeviceImage {
  estimate: Estimate | null;
  dispatch: { readonly time: string; readonly answers: readonly DispatchAnswer[] } | null;
  alarms: AlarmsMessage | null;
}

export interface DeviceMetric {
  readonly name: string;
  readonly datatype: number;
  /** null: it has no value now. */
  readonly value: number | string | null;
  /** Source time [ms since 1970]; null: that of the message. */
  readonly time_ms: number | null;
}

/** Fronts of a store that have metrics of their own; all metrics have to be in the birth. */
export const MOST_FRONTS = 3;
/** Ids in the text of what stands. */
const MOST_IDS = 50;
const QUANTILES = ['p90', 'p50', 'p10'] as const;

/**
 * What a unit is as a device of Sparkplug: the same names in the same order each time, with the units
 * of `rockhour/UNIT/state` and `.../dispatch` in them.
 */
export function deviceMetrics(unit: UnitDefinition, image: DeviceImage): DeviceMetric[] {
  const { estimate, dispatch } = image;
  const number = timed(estimate?.time);
  return [
    number('state_of_charge', estimate?.state_of_charge),
    text('mode', estimate?.mode, estimate?.time),
    text('quality', estimate?.quality, estimate?.time),
    ...unit.stores.flatMap(({ id }) => storeMetrics(id, estimate, number)),
    ...unit.hours_at_W.flatMap((power_W) => {
      const answer = dispatch?.answers.find(
        ({ power_MW }) => Math.abs(power_MW * 1e6 - power_W) <= 1e-6 * power_W,
      );
      return powerMetrics(power_W, answer, dispatch?.time);
    }),
    ...alarmMetrics(image.alarms),
  ];
}

type Numbered = (name: string, value: number | null | undefined) => DeviceMetric;

function storeMetrics(id: string, estimate: Estimate | null, number: Numbered): DeviceMetric[] {
  const store = estimate?.stores[id];
  const fronts = Array.from({ length: MOST_FRONTS }, (_, i) => {
    const front = store?.fronts[i];
    const at = `${id}/front${i + 1}`;
    return [
      number(`${at}/position_m`, front?.position_m),
      number(`${at}/position_sigma_m`, front?.position_sigma_m),
      number(`${at}/width_m`, front?.width_m),
      number(`${at}/width_sigma_m`, front?.width_sigma_m),
    ];
  });
  return [
    number(`${id}/soc`, store?.soc),
    number(`${id}/soc_sigma`, store?.soc_sigma),
    number(`${id}/stored_MWh_th`, store?.stored_MWh_th),
    number(`${id}/stored_sigma_MWh_th`, store?.stored_sigma_MWh_th),
    number(`${id}/energy_position_m`, store?.energy_position_m),
    { ...number(`${id}/fronts`, store?.fronts.length), datatype: DATATYPE.Int32 },
    ...fronts.flat(),
  ];
}

function powerMetrics(
  power_W: number,
  answer: DispatchAnswer | undefined,
  time: string | undefined,
): DeviceMetric[] {
  const at = `at_${power_W / 1e6}_MW_el`;
  const number = timed(time);
  return [
    ...QUANTILES.map((q) => number(`${at}/hours/${q}`, answer?.hours[q])),
    ...QUANTILES.map((q) => number(`${at}/MWh_el/${q}`, answer?.energy_MWh_el[q])),
    text(`${at}/ends_by`, answer?.ends_by, time),
  ];
}

function alarmMetrics(message: AlarmsMessage | null): DeviceMetric[] {
  const standing = (message?.standing ?? []) as readonly { id?: string; class?: string }[];
  const whole = (name: string, value: number) => ({
    ...timed(undefined)(name, message === null ? null : value),
    datatype: DATATYPE.Int32,
  });
  const of = (word: string) => standing.filter((entry) => entry.class === word).length;
  const ids = standing.slice(0, MOST_IDS).map(({ id }) => id);
  return [
    whole('alarms/standing', of('alarm')),
    whole('alarms/alerts_standing', of('alert')),
    text('alarms/ids', message === null ? undefined : ids.join(' '), undefined),
  ];
}

function timed(time: string | undefined): Numbered {
  const time_ms = time === undefined ? null : Date.parse(time);
  return (name, value) => ({
    ...{ name, time_ms, datatype: DATATYPE.Double },
    value: typeof value === 'number' && Number.isFinite(value) ? value : null,
  });
}

function text(name: string, value: string | undefined, time: string | undefined): DeviceMetric {
  const time_ms = time === undefined ? null : Date.parse(time);
  return { name, datatype: DATATYPE.String, value: value ?? null, time_ms };
}
