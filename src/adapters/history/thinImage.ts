import { deserialize, serialize } from 'node:v8';
import { deflateSync, inflateSync } from 'node:zlib';

/** Smaller squares are not worth a mark of their own. */
const LEAST_SIDE = 8;
/** Covariances hardly yield to more effort. */
const EFFORT = 1;

/** A square that is symmetric to the bit: its upper triangle, row by row. */
class Triangle {
  readonly triangle = true;
  constructor(
    readonly side: number,
    readonly values: Float64Array,
  ) {}
}

/**
 * A saved state in few bytes: of symmetric squares, which covariances are and which make up nine
 * tenths of it, one triangle; the whole in Node's structured clone format, deflated. A state comes
 * back to the bit.
 */
export function packImage(image: unknown): Buffer {
  return deflateSync(serialize(mapArrays(image, thinned)), { level: EFFORT });
}

/** Throws where it is damaged. */
export function unpackImage(packed: Buffer): unknown {
  return mapArrays(deserialize(inflateSync(packed)), (value) => value);
}

function thinned(array: Float64Array): unknown {
  const side = Math.sqrt(array.length);
  if (!Number.isInteger(side) || side < LEAST_SIDE || !isSymmetric(array, side)) return array;
  const values = new Float64Array((side * (side + 1)) / 2);
  let at = 0;
  for (let i = 0; i < side; i++) {
    const row = array.subarray(i * side + i, (i + 1) * side);
    values.set(row, at);
    at += row.length;
  }
  return new Triangle(side, values);
}

function filled({ side, values }: Triangle): Float64Array {
  const array = new Float64Array(side * side);
  let at = 0;
  for (let i = 0; i < side; i++) {
    for (let j = i; j < side; j++) {
      const value = values[at++]!;
      array[i * side + j] = value;
      array[j * side + i] = value;
    }
  }
  return array;
}

/** Bit for bit: what is not (as NaN, or zeros of either sign) is kept as it is. */
function isSymmetric(array: Float64Array, side: number): boolean {
  for (let i = 0; i < side; i++) {
    for (let j = i + 1; j < side; j++) {
      if (!Object.is(array[i * side + j], array[j * side + i])) return false;
    }
  }
  return true;
}

/** A copy in which arrays of numbers are what `map` makes of them, and triangles are squares again. */
function mapArrays(value: unknown, map: (array: Float64Array) => unknown): unknown {
  if (value instanceof Float64Array) return map(value);
  if (value === null || typeof value !== 'object' || ArrayBuffer.isView(value)) return value;
  if (Array.isArray(value)) return value.map((one) => mapArrays(one, map));
  if (value instanceof Map)
    return new Map([...value].map(([key, one]) => [key, mapArrays(one, map)]));
  if (value instanceof Triangle) return value;
  if (isTriangle(value)) return filled(value);
  if (Object.getPrototypeOf(value) !== Object.prototype) return value;
  return Object.fromEntries(Object.entries(value).map(([key, one]) => [key, mapArrays(one, map)]));
}

/** As it comes back from a structured clone, which keeps no class. */
function isTriangle(value: object): value is Triangle {
  return 'triangle' in value && value.triangle === true && 'side' in value;
}
