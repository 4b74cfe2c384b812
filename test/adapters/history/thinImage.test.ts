import { serialize } from 'node:v8';
import { describe, expect, it } from 'vitest';
import { packImage, unpackImage } from '../../../src/adapters/history/thinImage.js';
import { mulberry } from '../../support/random.js';

/** A square of drawn numbers, symmetric but for what `change` does to it. */
function square(side: number, change: (array: Float64Array) => void = () => undefined) {
  const random = mulberry(3);
  const array = new Float64Array(side * side);
  for (let i = 0; i < side; i++) {
    for (let j = i; j < side; j++) array[i * side + j] = array[j * side + i] = random() - 0.5;
  }
  change(array);
  return array;
}

describe('a saved state in few bytes', () => {
  it('comes back to the bit, and a covariance takes half', () => {
    const state = {
      covariance: square(100),
      lopsided: square(9, (array) => {
        array[1] = array[1]! + 2 ** -53;
      }),
      zeros: square(8, (array) => {
        array[1] = 0;
        array[8] = -0;
      }),
      unknown: square(8).fill(Number.NaN),
      slots: new Map([
        [7, { values: new Float64Array([1, Number.NaN, Number.NEGATIVE_INFINITY]) }],
      ]),
      rows: [new Uint8Array([1, 2]), 'text', null, undefined, true, { time_ms: 5 }],
      index: new Float64Array(3),
    };
    const packed = packImage(state);
    const back = unpackImage(packed);
    expect(serialize(back).equals(serialize(state))).toBe(true);
    expect(packed.length).toBeLessThan(0.55 * serialize(state).length);
  });

  it('that is damaged is refused', () => {
    expect(() => unpackImage(packImage({ a: 1 }).subarray(4))).toThrow();
  });
});
