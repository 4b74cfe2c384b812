import { numberOf, type PayloadFault, type Quality, type RoutedChannel } from '../payload.js';
import { type Metric, type Payload, sent, wide } from './messages.js';
import { metricValue, qualityOf } from './values.js';

/** Greatest time that a Date can hold [ms], ECMA-262 section 21.4.1.1. */
export const GREATEST_MS = 8.64e15;

/**
 * The value of a metric in the channel's SI, and its quality: bad and NaN where it has none.
 * @param datatype what its birth told; its own goes before that
 * @param fault called with what is wrong with it
 */
export function judged(
  routed: RoutedChannel,
  datatype: number | undefined,
  metric: Metric,
  fault: (name: PayloadFault) => void,
): { readonly value: number; readonly quality: Quality } {
  const bad = { value: Number.NaN, quality: 'bad' } as const;
  if (sent(metric, 'isNull') && metric.isNull === true) {
    fault('missing_value');
    return bad;
  }
  const quality = qualityOf(metric);
  if (quality === null) fault('unknown_quality');
  if (quality === null || quality === 'bad') return bad;
  const own = sent(metric, 'datatype') ? metric.datatype : datatype;
  const value = numberOf(routed, metricValue(metric, own));
  if (value !== null) return { value, quality };
  fault('bad_element');
  return bad;
}

/** Time of a payload [ms since 1970]; null where it has none that a date can hold. */
export function payloadTime(payload: Payload): number | null {
  if (!sent(payload, 'timestamp')) return null;
  const time_ms = wide(payload.timestamp!);
  return time_ms <= GREATEST_MS ? time_ms : null;
}

/** 0 where it was left out, as encoders do with zeros; null where it is no number of the sequence. */
export function seqOf(payload: Payload): number | null {
  const seq = sent(payload, 'seq') ? wide(payload.seq!) : 0;
  return seq <= 255 ? seq : null;
}

/** Number of the connection that a birth or a death belongs to. */
export function bdSeqOf(payload: Payload): number | null {
  const metric = payload.metrics?.find(({ name }) => name === 'bdSeq');
  if (metric === undefined) return null;
  if (sent(metric, 'longValue')) return wide(metric.longValue!);
  return sent(metric, 'intValue') ? metric.intValue! : null;
}
