/**
 * Saved states as text that comes from outside: JSON, in which what JSON has no form for is an object
 * with the key `$`. Reading it makes plain objects, arrays, maps and arrays of numbers, nothing else; a
 * value comes back to the bit.
 */

const MARK = '$';
/** No state is nested nearly as deeply. */
const MOST_DEPTH = 64;

type Numbers =
  | Float64Array
  | Float32Array
  | Int32Array
  | Uint32Array
  | Int16Array
  | Uint16Array
  | Int8Array
  | Uint8Array;
const NUMBERS = {
  Float64Array,
  Float32Array,
  Int32Array,
  Uint32Array,
  Int16Array,
  Uint16Array,
  Int8Array,
  Uint8Array,
} as const;

/** @throws RangeError for what is neither plain nor an array of numbers */
export function toSafeText(value: unknown): string {
  return JSON.stringify(encoded(value, 0));
}

/** @throws RangeError or SyntaxError where it is no such text */
export function fromSafeText(text: string): unknown {
  return decoded(JSON.parse(text), 0);
}

function encoded(value: unknown, depth: number): unknown {
  if (depth > MOST_DEPTH) throw new RangeError(`value must be at most ${MOST_DEPTH} deep`);
  if (typeof value === 'number') {
    const isOwn = Number.isFinite(value) && !Object.is(value, -0);
    return isOwn ? value : { [MARK]: 'number', text: Object.is(value, -0) ? '-0' : String(value) };
  }
  if (value === undefined) return { [MARK]: 'undefined' };
  if (value === null || typeof value === 'string' || typeof value === 'boolean') return value;
  if (typeof value !== 'object') throw new RangeError(`value must be data, got a ${typeof value}`);
  if (ArrayBuffer.isView(value)) return encodedNumbers(value as Numbers);
  if (Array.isArray(value)) return value.map((one) => encoded(one, depth + 1));
  if (value instanceof Map)
    return { [MARK]: 'Map', entries: [...value].map((pair) => encoded(pair, depth + 1)) };
  if (value instanceof Set)
    return { [MARK]: 'Set', values: [...value].map((one) => encoded(one, depth + 1)) };
  if (Object.getPrototypeOf(value) !== Object.prototype || MARK in value) {
    throw new RangeError(`value must be plain, got a ${value.constructor?.name ?? 'bare object'}`);
  }
  return Object.fromEntries(
    Object.entries(value).map(([key, one]) => [key, encoded(one, depth + 1)]),
  );
}

/** Bytes in the order of the machine, which is the same (least first) wherever Node 20 is had. */
function encodedNumbers(value: Numbers): object {
  const kind = value.constructor.name;
  if (!Object.hasOwn(NUMBERS, kind)) throw new RangeError(`value must be plain, got a ${kind}`);
  const { buffer, byteOffset, byteLength } = value;
  return { [MARK]: kind, base64: Buffer.from(buffer, byteOffset, byteLength).toString('base64') };
}

function decoded(value: unknown, depth: number): unknown {
  if (depth > MOST_DEPTH) throw new RangeError(`text must be at most ${MOST_DEPTH} deep`);
  if (value === null || typeof value !== 'object') return value;
  if (Array.isArray(value)) return value.map((one) => decoded(one, depth + 1));
  if (Object.hasOwn(value, MARK)) return decodedMark(value as Record<string, unknown>, depth);
  return Object.fromEntries(
    Object.entries(value).map(([key, one]) => {
      if (key === '__proto__') throw new RangeError('text must have no key __proto__');
      return [key, decoded(one, depth + 1)];
    }),
  );
}

function decodedMark({ [MARK]: kind, ...rest }: Record<string, unknown>, depth: number): unknown {
  const { text, base64, entries, values } = rest;
  if (kind === 'undefined') return undefined;
  if (kind === 'number' && ['NaN', 'Infinity', '-Infinity', '-0'].includes(String(text)))
    return Number(text);
  if (kind === 'Map' && Array.isArray(entries)) {
    return new Map(entries.map((pair) => decoded(pair, depth + 1) as [unknown, unknown]));
  }
  if (kind === 'Set' && Array.isArray(values))
    return new Set(values.map((one) => decoded(one, depth + 1)));
  if (typeof kind === 'string' && Object.hasOwn(NUMBERS, kind) && typeof base64 === 'string') {
    const Kind = NUMBERS[kind as keyof typeof NUMBERS];
    const bytes = Buffer.from(base64, 'base64');
    if (bytes.length % Kind.BYTES_PER_ELEMENT !== 0)
      throw new RangeError(`a ${kind} must be whole, got ${bytes.length} bytes`);
    // A copy of its own: a buffer may lie anywhere in a larger one.
    return new Kind(new Uint8Array(bytes).buffer);
  }
  throw new RangeError(`a mark must be of a known kind, got ${JSON.stringify(kind)}`);
}
