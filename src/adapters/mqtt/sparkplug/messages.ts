import protobuf from 'protobufjs/light.js';

/** A whole number of 64 bits as protobufjs reads it. */
export type Wide = number | { readonly low: number; readonly high: number };

/** One metric as it stands in a payload; what was not sent is absent. Fields that nothing here uses are skipped. */
export interface Metric {
  readonly name?: string;
  readonly alias?: Wide;
  readonly timestamp?: Wide;
  readonly datatype?: number;
  readonly isHistorical?: boolean;
  readonly isNull?: boolean;
  /** A PropertySet, still encoded: it is read only of metrics that are used. */
  readonly properties?: Uint8Array;
  readonly intValue?: number;
  readonly longValue?: Wide;
  readonly floatValue?: number;
  readonly doubleValue?: number;
  readonly booleanValue?: boolean;
  readonly stringValue?: string;
}

export interface Payload {
  readonly timestamp?: Wide;
  readonly metrics?: readonly Metric[];
  readonly seq?: Wide;
}

interface PropertySet {
  readonly keys?: readonly string[];
  readonly values?: readonly Omit<Metric, 'properties'>[];
}

/** Longest payload that is looked at [bytes]; a birth of a few thousand metrics has a tenth of it. */
export const MOST_BYTES = 1_048_576;
/** Most metrics of one payload. */
export const MOST_METRICS = 10_000;
const MOST_PROPERTY_BYTES = 16_384;
/** Field `metrics` of a payload. */
const METRICS_ID = 2;

const one = (id: number, type: string) => ({ id, type });
const many = (id: number, type: string) => ({ rule: 'repeated', id, type });

/**
 * The messages of Sparkplug B, version 3.0.0, section 6.4, as far as they are used: numbers and types
 * are the specification's. Properties stay bytes, which is the same on the wire, and data sets,
 * templates, metadata and bodies are not told, so that they are skipped; nothing here nests itself. The
 * edition makes protobufjs tell a zero that was sent from a field that was not.
 */
const root = protobuf.Root.fromJSON({
  nested: {
    Payload: {
      edition: 'proto2',
      fields: {
        timestamp: one(1, 'uint64'),
        metrics: many(METRICS_ID, 'Metric'),
        seq: one(3, 'uint64'),
      },
    },
    Metric: {
      edition: 'proto2',
      fields: {
        name: one(1, 'string'),
        alias: one(2, 'uint64'),
        timestamp: one(3, 'uint64'),
        datatype: one(4, 'uint32'),
        isHistorical: one(5, 'bool'),
        isNull: one(7, 'bool'),
        properties: one(9, 'bytes'),
        intValue: one(10, 'uint32'),
        longValue: one(11, 'uint64'),
        floatValue: one(12, 'float'),
        doubleValue: one(13, 'double'),
        booleanValue: one(14, 'bool'),
        stringValue: one(15, 'string'),
      },
    },
    PropertySet: {
      edition: 'proto2',
      fields: { keys: many(1, 'string'), values: many(2, 'PropertyValue') },
    },
    PropertyValue: {
      edition: 'proto2',
      fields: {
        datatype: one(1, 'uint32'),
        isNull: one(2, 'bool'),
        intValue: one(3, 'uint32'),
        longValue: one(4, 'uint64'),
        floatValue: one(5, 'float'),
        doubleValue: one(6, 'double'),
        booleanValue: one(7, 'bool'),
        stringValue: one(8, 'string'),
      },
    },
  },
});
const payloadType = root.lookupType('Payload');
const propertySetType = root.lookupType('PropertySet');

/** Why a payload is not read. */
export type Unreadable = 'garbled' | 'too_large';

/**
 * Reads a payload; never throws. What was not sent is no own key of a metric. What it can cost is
 * bounded before anything is built: by the length, and by the metrics, which are counted first.
 */
export function readPayload(bytes: Uint8Array): Payload | Unreadable {
  if (bytes.length > MOST_BYTES) return 'too_large';
  try {
    const reader = protobuf.Reader.create(bytes);
    let metrics = 0;
    while (reader.pos < reader.len) {
      const tag = reader.uint32();
      if (tag >>> 3 === METRICS_ID && ++metrics > MOST_METRICS) return 'too_large';
      reader.skipType(tag & 7, 0, tag >>> 3);
    }
    return payloadType.decode(bytes) as unknown as Payload;
  } catch {
    return 'garbled';
  }
}

/** A property of a metric by its key; null where it has none, undefined where they cannot be read. */
export function propertyOf(metric: Metric, key: string): Metric | null | undefined {
  if (!sent(metric, 'properties')) return null;
  const bytes = metric.properties!;
  if (bytes.length > MOST_PROPERTY_BYTES) return undefined;
  try {
    const { keys = [], values = [] } = propertySetType.decode(bytes) as unknown as PropertySet;
    return values[keys.indexOf(key)] ?? null;
  } catch {
    return undefined;
  }
}

export function writePayload(payload: Payload): Buffer {
  return Buffer.from(payloadType.encode(payloadType.fromObject(payload)).finish());
}

/** A set of properties as a metric carries it. */
export function writeProperties(entries: Readonly<Record<string, Metric>>): Uint8Array {
  const set = { keys: Object.keys(entries), values: Object.values(entries) };
  return propertySetType.encode(propertySetType.fromObject(set)).finish();
}

/** Whether a field was on the wire: what was not reads as its default. */
export function sent<T extends object>(message: T, field: keyof T): boolean {
  return Object.hasOwn(message, field);
}

/** An unsigned number of 64 bits; NaN beyond 2^53, where a number would be another one. */
export function wide(value: Wide): number {
  const number =
    typeof value === 'number' ? value : (value.high >>> 0) * 2 ** 32 + (value.low >>> 0);
  return Number.isSafeInteger(number) ? number : Number.NaN;
}

/** The same as two's complement of 64 bits. */
export function signedWide(value: Wide): number {
  if (typeof value === 'number') return wide(value);
  const number = (value.high | 0) * 2 ** 32 + (value.low >>> 0);
  return Number.isSafeInteger(number) ? number : Number.NaN;
}

/** An alias as a key: exact over all of its 64 bits. */
export function aliasKey(value: Wide): number | string {
  const number = wide(value);
  if (!Number.isNaN(number) || typeof value === 'number') return number;
  return `${value.high >>> 0}:${value.low >>> 0}`;
}
