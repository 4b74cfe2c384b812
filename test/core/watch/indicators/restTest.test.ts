import { describe, expect, it } from 'vitest';
import { lookAtRest, scoresOf } from '../../../../src/core/watch/indicators/restTest.js';
import { newInformation, startSequential } from '../../../../src/core/watch/sequential.js';
import { normals } from '../normals.js';

const QUESTION = { healthy: 1, degraded: 1.6 };
const DECISION = 10;

/** Looks at one rest: value and sigma of each. */
function rest(test: ReturnType<typeof startSequential>, looks: readonly [number, number][]) {
  const from = scoresOf(test);
  for (const [value, sigma] of looks)
    lookAtRest(test, from, { value, sigma, ...QUESTION }, DECISION);
}

describe('looks at a rest', () => {
  it('count as the newest of them does: one that is taken back leaves nothing', () => {
    const test = startSequential();
    rest(test, [
      [1.9, 0.3],
      [1.7, 0.25],
      [0.94, 0.1],
    ]);
    expect(test).toMatchObject({ degraded: false, up: 0, count: 3 });
  });

  it('do not take a value that rises to its healthy one for one beyond it', () => {
    // As rests of a sound store come out: too low at first. As news of each other they would be 1.4.
    const looks: [number, number][] = [
      [0.6, 0.15],
      [0.8, 0.13],
      [0.95, 0.11],
      [1.02, 0.1],
    ];
    const [before, after] = [looks[2]!, looks[3]!].map(([value, sigma]) => ({ value, sigma }));
    expect(newInformation(before!, after!, 0)!.value).toBeGreaterThan(1.3);
    const test = startSequential();
    rest(test, looks);
    expect(test.up).toBe(0);
  });

  it('decide by two or more that agree, and bring it back likewise, within a rest or over several', () => {
    const test = startSequential();
    const from = scoresOf(test);
    const wet = { value: 2, sigma: 0.1, ...QUESTION };
    lookAtRest(test, from, wet, DECISION);
    expect(test.degraded).toBe(false);
    lookAtRest(test, from, wet, DECISION);
    expect(test.degraded).toBe(true);
    for (const left of [true, false]) {
      lookAtRest(test, from, { ...wet, value: 1 }, DECISION);
      expect(test.degraded).toBe(left);
    }
    // 0.6/0.09 (1.7 - 1.3) = 2.7 a rest, whatever its looks.
    for (let n = 0; n < 4; n++) {
      expect(test.degraded).toBe(false);
      rest(test, [
        [1.2, 0.4],
        [1.7, 0.3],
        [1.7, 0.3],
      ]);
    }
    expect(test.degraded).toBe(true);
  });

  it('keep the in-control time by looks, where all looks of a rest err alike and where each errs anew', () => {
    const looks = 10;
    for (const common of [0, 0.9, 1]) {
      const z = normals(30 + common);
      let decided = 0;
      let all = 0;
      for (let run = 0; run < 300; run++) {
        const test = startSequential();
        for (let n = 0; n < 30 && !test.degraded; n++) {
          const from = scoresOf(test);
          const shared = z();
          for (let l = 0; l < looks && !test.degraded; l++) {
            const error = common * shared + Math.sqrt(1 - common ** 2) * z();
            const value = 1 + 0.35 * error;
            lookAtRest(test, from, { value, sigma: 0.35, ...QUESTION }, 5);
            all++;
          }
        }
        if (test.degraded) decided++;
      }
      // Of e^5 = 148 looks at least in the mean until one decides falsely.
      expect(all / Math.max(1, decided)).toBeGreaterThan(148);
    }
  });

  it('refuses what is no sigma and no threshold', () => {
    const test = startSequential();
    const value = { value: 1, sigma: 0.1, ...QUESTION };
    expect(() => lookAtRest(test, scoresOf(test), { ...value, sigma: 0 }, 5)).toThrow(/sigma.*0/);
    expect(() => lookAtRest(test, scoresOf(test), value, 0)).toThrow(/decision.*0/);
    expect(() => lookAtRest(test, scoresOf(test), { ...value, value: Number.NaN }, 5)).toThrow(
      /NaN/,
    );
  });
});
