import { describe, expect, it } from 'vitest';
import { lookAt, nonNegative, sound } from '../../tools/score/soundState.js';
import { startedUnit } from './startedUnit.js';

const symmetric = (size: number, of: (i: number, j: number) => number) =>
  Float64Array.from({ length: size * size }, (_, k) => {
    const [i, j] = [Math.floor(k / size), k % size];
    return of(Math.min(i, j), Math.max(i, j));
  });

describe('a matrix without negative eigenvalues', () => {
  const units = [1, 1e-3, 1e4, 30];

  it('passes whatever the units of its states, singular or not', () => {
    const scaled = (i: number, j: number) => units[i]! * units[j]!;
    // All ones: rank one.
    expect(nonNegative(symmetric(4, scaled), 4, 1e-9)).toBe(true);
    const half = symmetric(4, (i, j) => scaled(i, j) * (i === j ? 1 : 0.5));
    expect(nonNegative(half, 4, 0)).toBe(true);
    expect(nonNegative(new Float64Array(16), 4, 1e-9)).toBe(true);
  });

  it('is told from one with an eigenvalue just below zero', () => {
    // Correlation -1/3 between four states is the least there is; a little less is too much:
    // the least eigenvalue is 1 + 3 r.
    const with_ = (r: number) => symmetric(4, (i, j) => units[i]! * units[j]! * (i === j ? 1 : r));
    expect(nonNegative(with_(-1 / 3), 4, 1e-9)).toBe(true);
    expect(nonNegative(with_(-1 / 3 - 1e-8), 4, 1e-9)).toBe(false);
    expect(nonNegative(with_(-1 / 3 - 1e-8), 4, 1e-7)).toBe(true);
  });

  it('has no covariance where it has no variance, and none below zero', () => {
    expect(nonNegative(Float64Array.of(0, 0.1, 0.1, 1), 2, 1e-9)).toBe(false);
    expect(nonNegative(Float64Array.of(-1, 0, 0, 1), 2, 1e-9)).toBe(false);
  });
});

describe('a look at the state', () => {
  it('finds nothing wrong with a sound one', () => {
    const counts = sound();
    lookAt(startedUnit(), counts);
    expect(counts).toEqual({ ...sound(), scans: 1, factorised: 1 });
  });

  it.each([
    ['not_symmetric', 1, (p: Float64Array) => p[1]! + 1e-12],
    ['negative', 0, () => -1e-9],
    ['not_finite', 1, () => Number.NaN],
  ] as const)('counts one that is %s, once for each scan', (name, place, of) => {
    const state = startedUnit();
    for (const store of state.stores) {
      for (const tube of store.tubes) tube.covariance[place] = of(tube.covariance);
    }
    const counts = { ...sound(), scans: 1 };
    lookAt(state, counts);
    expect(counts[name]).toBe(1);
    lookAt(state, counts);
    expect(counts[name]).toBe(2);
    expect(counts).toMatchObject({ scans: 3, factorised: 0 });
  });

  it('counts a negative eigenvalue at every thirtieth scan, and keeps the least', () => {
    const state = startedUnit();
    const { covariance } = state.stores[0]!.tubes[0]!;
    const size = Math.sqrt(covariance.length);
    // Two neighbours correlated by 1.5: least eigenvalue -0.5 or less.
    const own = 1.5 * Math.sqrt(covariance[0]! * covariance[size + 1]!);
    covariance[1] = own;
    covariance[size] = own;
    const counts = sound();
    for (let n = 0; n < 60; n++) lookAt(state, counts);
    expect(counts).toMatchObject({ indefinite: 2, factorised: 2, not_symmetric: 0, negative: 0 });
    expect(counts.least).toBeLessThan(-0.5);
  });

  it('finds NaN among temperatures and factors', () => {
    for (const array of ['enthalpy', 'further'] as const) {
      const state = startedUnit();
      state.stores[1]!.tubes[0]![array][3] = Number.NaN;
      const counts = sound();
      lookAt(state, counts);
      expect(counts).toMatchObject({ not_finite: 1, indefinite: 0 });
    }
  });
});
