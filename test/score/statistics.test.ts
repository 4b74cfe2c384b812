import { describe, expect, it } from 'vitest';
import {
  bestShiftedPinball,
  binomialInterval,
  pinball,
  student95,
} from '../../tools/score/statistics.js';
import { mulberry } from '../support/random.js';

const groups = (count: number, cases: number, hits: (g: number) => number) =>
  Array.from({ length: count }, (_, g) => ({ hits: hits(g), cases }));

describe('the binomial interval', () => {
  it('is that of independent cases where seeds differ no more than by chance', () => {
    // 10 of 100 in every group: less scatter than chance, so no case counts as more than one.
    const b = binomialInterval(
      0.1,
      groups(10, 100, () => 10),
    );
    expect(b.share).toBeCloseTo(0.1, 12);
    expect(b.effective).toBe(1000);
    expect(b.high - 0.1).toBeCloseTo(2.262 * Math.sqrt(0.09 / 1000), 4);
    expect(0.1 - b.low).toBeCloseTo(b.high - 0.1, 12);
  });

  it('counts seeds instead of cases where all cases of a seed are alike', () => {
    // All or none of 50: one draw per group. The sample variance has n/(n-1) of 20 groups.
    const b = binomialInterval(
      0.2,
      groups(20, 50, (g) => (g < 4 ? 50 : 0)),
    );
    expect(b.effective).toBeCloseTo(19, 9);
  });

  it('counts each seed as one where nothing tells how alike its cases are', () => {
    const none = groups(35, 20, () => 0);
    expect(binomialInterval(0.1, none).effective).toBeCloseTo(35, 9);
  });

  it('takes one seed alone as one case', () => {
    const b = binomialInterval(0.1, [{ hits: 3, cases: 20 }]);
    expect(b.effective).toBe(1);
    expect([b.low, b.high]).toEqual([0, expect.closeTo(0.1 + 1.96 * 0.3, 3)]);
  });

  it('takes the spread from few seeds with their degrees of freedom', () => {
    // Abramowitz & Stegun 1964, table 26.10, two-sided 5 %.
    for (const [degrees, t] of [
      [4, 2.776],
      [15, 2.131],
      [34, 2.032],
      [120, 1.98],
    ] as const) {
      expect(student95(degrees)).toBeCloseTo(t, 3);
    }
  });

  it('holds the true share in 95 of 100 repetitions, with cases that are alike within a seed', () => {
    const random = mulberry(5);
    const repetitions = 2000;
    let inside = 0;
    for (let r = 0; r < repetitions; r++) {
      const drawn = groups(35, 20, () => {
        // Half of the cases of a seed repeat one draw, the others are their own.
        let hits = random() < 0.2 ? 10 : 0;
        for (let i = 0; i < 10; i++) hits += random() < 0.2 ? 1 : 0;
        return hits;
      });
      const b = binomialInterval(0.2, drawn);
      if (b.share >= b.low && b.share <= b.high) inside++;
    }
    // 95 % +/- 3 standard errors of 2000 repetitions (0.49 %), and 2 % for the effect's own scatter.
    expect(inside / repetitions).toBeGreaterThan(0.95 - 0.015 - 0.02);
    expect(inside / repetitions).toBeLessThan(0.95 + 0.015 + 0.01);
  });

  it('is undefined without cases', () => {
    expect(binomialInterval(0.1, []).share).toBeNaN();
  });
});

describe('the pinball loss', () => {
  it('weighs what is above a p90 by 0.1 and what is below by 0.9', () => {
    expect(pinball(0.1, [{ truth: 3, quantile: 1 }])).toBeCloseTo(0.2, 12);
    expect(pinball(0.1, [{ truth: 1, quantile: 3 }])).toBeCloseTo(1.8, 12);
    expect(pinball(0.5, [{ truth: 1, quantile: 3 }])).toBeCloseTo(1, 12);
  });

  it('is least at the true quantile', () => {
    const random = mulberry(9);
    const truths = Array.from({ length: 4000 }, () => random());
    const at = (quantile: number) =>
      pinball(
        0.1,
        truths.map((truth) => ({ truth, quantile })),
      );
    expect(at(0.1)).toBeLessThan(at(0.05));
    expect(at(0.1)).toBeLessThan(at(0.15));
  });
});

describe('the best constant margin', () => {
  const random = mulberry(11);
  const samples = Array.from({ length: 300 }, () => {
    const truth = 2 + 4 * random();
    return { truth, forecast: truth + 1.5 + random() };
  });

  it('beats every other margin on a fine grid', () => {
    for (const tau of [0.1, 0.5]) {
      const best = bestShiftedPinball(tau, samples);
      for (let shift = -4; shift <= 1; shift += 0.01) {
        const shifted = samples.map((s) => ({
          truth: s.truth,
          quantile: Math.max(0, s.forecast + shift),
        }));
        expect(best.loss).toBeLessThanOrEqual(pinball(tau, shifted) + 1e-12);
      }
    }
  });

  it('leaves a tenth of the truths below a p90', () => {
    const { shift } = bestShiftedPinball(0.1, samples);
    const below = samples.filter((s) => s.truth < s.forecast + shift).length;
    expect(Math.abs(below - 30)).toBeLessThanOrEqual(1);
  });
});
