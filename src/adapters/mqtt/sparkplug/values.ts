import type { Quality } from '../payload.js';
import { type Metric, propertyOf, sent, signedWide, wide } from './messages.js';

/** Numbers of the data types, Sparkplug B 3.0.0, section 6.4.16; those that no channel has are left out. */
export const DATATYPE = {
  Int8: 1,
  Int16: 2,
  Int32: 3,
  Int64: 4,
  UInt8: 5,
  UInt16: 6,
  UInt32: 7,
  UInt64: 8,
  Float: 9,
  Double: 10,
  Boolean: 11,
  String: 12,
  DateTime: 13,
  Text: 14,
} as const;

/** Bits of the whole numbers that are sent as 32 bits. */
const SIGNED: Readonly<Record<number, number>> = { 1: 8, 2: 16, 3: 32 };
const UNSIGNED: Readonly<Record<number, number>> = { 5: 8, 6: 16, 7: 32 };

/**
 * The value of a metric. Whole numbers below zero are two's complement, of their own width or carried on
 * to 32 bits: encoders do either.
 *
 * @param datatype that of the metric, or of its birth; undefined where neither told one
 * @returns null where the metric has no value of that type, or one that a number cannot hold exactly
 */
export function metricValue(
  metric: Metric,
  datatype: number | undefined,
): number | string | boolean | null {
  if (datatype === undefined || datatype === 0) return untyped(metric);
  const signed = SIGNED[datatype];
  const unsigned = UNSIGNED[datatype];
  if (signed !== undefined || unsigned !== undefined) {
    // UInt32 is sent as 64 bits by encoders whose language has no unsigned numbers.
    const isLong = datatype === DATATYPE.UInt32 && sent(metric, 'longValue');
    if (!isLong && !sent(metric, 'intValue')) return null;
    const raw = isLong ? wide(metric.longValue!) : metric.intValue! >>> 0;
    return signed === undefined ? inBits(raw, unsigned!) : twosComplement(raw, signed);
  }
  switch (datatype) {
    case DATATYPE.Int64:
      return sent(metric, 'longValue') ? exact(signedWide(metric.longValue!)) : null;
    case DATATYPE.UInt64:
    case DATATYPE.DateTime:
      return sent(metric, 'longValue') ? exact(wide(metric.longValue!)) : null;
    case DATATYPE.Float:
      return sent(metric, 'floatValue') ? metric.floatValue! : null;
    case DATATYPE.Double:
      return sent(metric, 'doubleValue') ? metric.doubleValue! : null;
    case DATATYPE.Boolean:
      return sent(metric, 'booleanValue') ? metric.booleanValue! : null;
    case DATATYPE.String:
    case DATATYPE.Text:
      return sent(metric, 'stringValue') ? metric.stringValue! : null;
    default:
      return null;
  }
}

/** Without a type a whole number may be signed or not: only where both are the same is it one. */
function untyped(metric: Metric): number | string | boolean | null {
  for (const field of ['floatValue', 'doubleValue', 'booleanValue', 'stringValue'] as const) {
    if (sent(metric, field)) return metric[field]!;
  }
  if (sent(metric, 'intValue')) return inBits(metric.intValue! >>> 0, 31);
  return sent(metric, 'longValue') ? exact(wide(metric.longValue!)) : null;
}

function inBits(raw: number, bits: number): number | null {
  return raw < 2 ** bits ? raw : null;
}

function twosComplement(raw: number, bits: number): number | null {
  const half = 2 ** (bits - 1);
  if (raw < half) return raw;
  if (raw < 2 * half) return raw - 2 * half;
  return raw >= 2 ** 32 - half ? raw - 2 ** 32 : null;
}

const exact = (number: number) => (Number.isNaN(number) ? null : number);

/** Values of the property `Quality`, Sparkplug B 3.0.0, section 6.4.14. */
const GOOD = 192;
const NOT_GOOD = [0, 500];

/** Quality of a metric by its property; null where that is none of the specification's. */
export function qualityOf(metric: Metric): Quality | null {
  const property = propertyOf(metric, 'Quality');
  if (property === null) return 'good';
  if (property === undefined || property.isNull) return null;
  const code = metricValue(property, sent(property, 'datatype') ? property.datatype : undefined);
  if (code === GOOD) return 'good';
  return NOT_GOOD.includes(code as number) ? 'bad' : null;
}
