import type { ChannelSource } from '../../config/site.js';
import type { ChannelDefinition } from '../../core/definitions.js';
import { rawToSi } from '../../core/scan/convert.js';
import { modeOfWord, openingOfWord } from '../../core/scan/words.js';
import { sourceTime } from './time.js';

/** What can be wrong with a message or a part of it; the names are also those of the counters. */
export const PAYLOAD_FAULTS = [
  /** Not JSON, no object, or a time or value of a wrong type: nothing of it is taken. */
  'malformed',
  /** An array, or its qualities, with another number of entries than the string has. */
  'wrong_length',
  /** One entry of an array is neither a number nor null: that channel is missing. */
  'bad_element',
  /** A quality that is not good, uncertain or bad: taken for bad. */
  'unknown_quality',
  /** No time: the time of arrival stands in. */
  'without_time',
  /** A value of null: the channel is missing. */
  'missing_value',
] as const;
export type PayloadFault = (typeof PAYLOAD_FAULTS)[number];

export type Quality = 'good' | 'uncertain' | 'bad';

export interface PayloadReading {
  readonly channel: ChannelDefinition;
  readonly time_ms: number;
  /** SI (mV as it is); NaN where missing or bad. */
  readonly value: number;
  readonly quality: Quality;
}

/** A source with the definitions of its channels, in its order. */
export interface Route {
  readonly source: ChannelSource;
  readonly channels: readonly RoutedChannel[];
}

export interface RoutedChannel {
  readonly definition: ChannelDefinition;
  readonly toSi: (raw: number) => number;
}

export function makeRoute(source: ChannelSource, channels: readonly ChannelDefinition[]): Route {
  return { source, channels: channels.map(routedChannel) };
}

export function routedChannel(definition: ChannelDefinition): RoutedChannel {
  return { definition, toSi: rawToSi(definition) };
}

/**
 * The readings in a message. Checked by hand, because a schema library costs as much again as
 * JSON.parse itself (0.7 us of 122 bytes); a test holds it against a zod schema on random input.
 *
 *     value:  {"time": TIME, "value": NUMBER, "quality": QUALITY}
 *     array:  {"time": TIME, "values": [NUMBER, ...], "quality": QUALITY or [QUALITY, ...]}
 *
 * TIME is ISO 8601 with an offset or ms since 1970; QUALITY is good, uncertain or bad, without one
 * it is good. null is a missing value. A mode may be charge, stand or discharge, a valve open or
 * closed or a boolean. Further keys are let pass.
 *
 * @param fault called with each thing that is wrong
 * @returns empty where nothing can be taken
 */
export function parsePayload(
  route: Route,
  text: string,
  arrival_ms: number,
  fault: (fault: PayloadFault) => void,
): PayloadReading[] {
  const message = parseObject(text);
  if (message === null) return refuse(fault, 'malformed');
  const values = valuesOf(route, message);
  if (values === null) return refuse(fault, 'malformed');
  if (values.length !== route.channels.length) return refuse(fault, 'wrong_length');
  const { quality } = message;
  const perEntry = route.source.payload === 'array' && Array.isArray(quality);
  if (perEntry && quality.length !== values.length) return refuse(fault, 'wrong_length');
  const time_ms = message.time === undefined ? arrival_ms : sourceTime(message.time);
  if (Number.isNaN(time_ms)) return refuse(fault, 'malformed');
  if (message.time === undefined) fault('without_time');
  return route.channels.map((routed, i) => {
    const channel = routed.definition;
    const value = numberOf(routed, values[i]);
    const stated = qualityOf(perEntry ? quality[i] : quality);
    if (stated === null) fault('unknown_quality');
    if (value === null) fault(values[i] === null ? 'missing_value' : 'bad_element');
    return value === null || stated === null || stated === 'bad'
      ? { channel, time_ms, value: Number.NaN, quality: 'bad' }
      : { channel, time_ms, value, quality: stated };
  });
}

function refuse(fault: (fault: PayloadFault) => void, name: PayloadFault): PayloadReading[] {
  fault(name);
  return [];
}

function parseObject(text: string): Record<string, unknown> | null {
  try {
    const parsed: unknown = JSON.parse(text);
    const isObject = typeof parsed === 'object' && parsed !== null && !Array.isArray(parsed);
    return isObject ? (parsed as Record<string, unknown>) : null;
  } catch {
    return null;
  }
}

/** Values in the order of the channels; null where the key is missing or of a wrong type. */
function valuesOf(route: Route, message: Record<string, unknown>): readonly unknown[] | null {
  if (route.source.payload === 'array')
    return Array.isArray(message.values) ? message.values : null;
  const { value } = message;
  // A single value of a wrong type is a malformed message; in an array it spoils only itself.
  if (value !== null && numberOf(route.channels[0]!, value) === null) return null;
  return [value];
}

/** A raw value in SI, null where it is no value of this channel. */
export function numberOf({ definition, toSi }: RoutedChannel, raw: unknown): number | null {
  const { kind } = definition.role;
  const si = typeof raw === 'number' ? toSi(raw) : wordOf(kind, raw);
  // JSON has no NaN, but 1e999 is an infinity.
  return Number.isFinite(si) ? si : null;
}

function wordOf(kind: ChannelDefinition['role']['kind'], raw: unknown): number {
  if (kind === 'mode' && typeof raw === 'string') return modeOfWord(raw);
  if (kind === 'valve' && (typeof raw === 'string' || typeof raw === 'boolean')) {
    return openingOfWord(String(raw));
  }
  return Number.NaN;
}

function qualityOf(quality: unknown): Quality | null {
  if (quality === undefined) return 'good';
  return quality === 'good' || quality === 'uncertain' || quality === 'bad' ? quality : null;
}
