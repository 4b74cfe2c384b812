import { describe, expect, it } from 'vitest';
import { earliestQuantiles } from '../../../src/core/dispatch/earliestQuantiles.js';
import {
  inverseNormal,
  normalDistribution,
  normalPoints,
} from '../../../src/core/dispatch/normalPoints.js';
import { integrate } from '../../support/quadrature.js';

const density = (x: number): number => Math.exp((-x * x) / 2) / Math.sqrt(2 * Math.PI);

describe('the normal distribution', () => {
  it.each([0, 0.5, 1, 1.5, 2.5, 2.999, 3, 3.001, 4.5, 6])(
    'is the integral of its density at %d',
    (x) => {
      // Eight Gauss points on panels of x/32: far below 1e-13 for so smooth a function.
      const exact = 0.5 + integrate(density, 0, x, 32);
      expect(Math.abs(normalDistribution(x) - exact)).toBeLessThan(1e-13);
      expect(Math.abs(normalDistribution(-x) - (1 - exact))).toBeLessThan(1e-13);
    },
  );

  it.each([1e-9, 1e-4, 0.1, 0.25, 0.5, 0.9, 0.9999])('has the inverse that gives back %d', (p) => {
    expect(Math.abs(normalDistribution(inverseNormal(p)) / p - 1)).toBeLessThan(1e-11);
  });

  it.each([0, 1, -0.1, 2, Number.NaN])('has no inverse at %d', (p) => {
    expect(() => inverseNormal(p)).toThrow(new RangeError(`p = ${p}: expected 0 < p < 1`));
  });
});

describe('the fixed points', () => {
  const columns = normalPoints();
  const count = (columns[0] as Float64Array).length;

  it('have the mean, variance and covariances of independent standard normals', () => {
    columns.forEach((a, i) => {
      columns.slice(0, i + 1).forEach((b, j) => {
        let sum = 0;
        for (let k = 0; k < count; k++) sum += (a[k] as number) * (b[k] as number);
        // Low discrepancy: the error falls as (log N)^2/N = 0.03 for 2048 points, not as its root.
        expect(Math.abs(sum / count - (i === j ? 1 : 0)), `${i}, ${j}`).toBeLessThan(0.03);
      });
      expect(Math.abs(a.reduce((sum, v) => sum + v, 0) / count)).toBeLessThan(0.01);
    });
  });
});

describe('quantiles of the earliest time', () => {
  const quantilesOf = (mean: number[], covariance: number[][]) =>
    earliestQuantiles(
      mean.map((h) => h * 3600),
      covariance.map((row) => Float64Array.from(row, (v) => v * 3600 * 3600)),
    );

  it('are those of a normal for one rule', () => {
    const { p90, p50, p10 } = quantilesOf([5], [[0.25]]);
    // Neighbouring points lie 1/2048 apart in probability: 0.003 sigma at the 10 % quantile.
    expect(Math.abs(p50 - 5) / 0.5).toBeLessThan(0.005);
    expect(Math.abs(p90 - (5 - 1.2815516 * 0.5)) / 0.5).toBeLessThan(0.005);
    expect(Math.abs(p10 - (5 + 1.2815516 * 0.5)) / 0.5).toBeLessThan(0.005);
  });

  it('are those of the lesser of two independent times', () => {
    const { p90, p50, p10 } = quantilesOf(
      [5, 5],
      [
        [0.25, 0],
        [0, 0.25],
      ],
    );
    // P(min > t) = Q(t)^2: the median of the minimum is where Q = sqrt(0.5), and so on.
    const at = (p: number): number => 5 - 0.5 * inverseNormal(Math.sqrt(p));
    expect(Math.abs(p50 - at(0.5)) / 0.5).toBeLessThan(0.02);
    expect(Math.abs(p90 - at(0.9)) / 0.5).toBeLessThan(0.02);
    expect(Math.abs(p10 - at(0.1)) / 0.5).toBeLessThan(0.02);
  });

  it('are those of one where two times are the same variable', () => {
    const two = quantilesOf(
      [5, 5],
      [
        [0.25, 0.25],
        [0.25, 0.25],
      ],
    );
    expect(two).toEqual(quantilesOf([5], [[0.25]]));
  });

  it('are the mean where nothing is uncertain, and never before now', () => {
    expect(
      quantilesOf(
        [5, 7],
        [
          [0, 0],
          [0, 0],
        ],
      ),
    ).toEqual({ p90: 5, p50: 5, p10: 5 });
    expect(quantilesOf([0.1], [[1]]).p90).toBe(0);
  });
});
