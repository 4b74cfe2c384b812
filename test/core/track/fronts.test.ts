import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { energyPosition } from '../../../src/core/track/energyPosition.js';
import { crossingDerivative, frontSigma } from '../../../src/core/track/frontSigma.js';
import { findFronts } from '../../../src/core/track/fronts.js';
import { fixtureRows, numberIn } from '../../support/table.js';

const TH = 773.15;
const TC = 298.15;
const at = (theta: number) => TC + theta * (TH - TC);

/** Cell centres of a bed of length L. */
function centres(n: number, length: number): Float64Array {
  return Float64Array.from({ length: n }, (_, i) => ((i + 0.5) * length) / n);
}
function profile(x: Float64Array, theta: (x: number) => number): Float64Array {
  return Float64Array.from(x, (value) => at(theta(value)));
}
const find = (x: Float64Array, T: Float64Array) => findFronts(x, T, TH, TC);

describe('fronts of a profile', () => {
  const x = centres(100, 5);

  it('finds position and width of a straight ramp exactly', () => {
    // theta = 0.5 - (x - 2)/1: 16 % and 84 % are 0.68 m apart.
    const { fronts, reason } = find(
      x,
      profile(x, (v) => Math.min(1, Math.max(0, 0.5 - (v - 2)))),
    );
    expect(reason).toBeNull();
    expect(fronts).toHaveLength(1);
    // Straight lines reproduce a ramp: only round-off of temperatures near 500 K remains.
    expect(fronts[0]!.position_m).toBeCloseTo(2, 10);
    expect(fronts[0]!.width_m).toBeCloseTo(0.34, 10);
    expect(fronts[0]!.slope_K_m).toBeCloseTo(-(TH - TC), 6);
    expect(fronts[0]!.span).toBeCloseTo(1, 12);
  });

  it('finds the same front in a cold store, where the temperature rises with x', () => {
    const falling = profile(x, (v) => 0.5 - 0.5 * Math.tanh((v - 2.2) / 0.4));
    const rising = profile(x, (v) => 0.5 + 0.5 * Math.tanh((v - 2.2) / 0.4));
    const a = find(x, falling).fronts[0]!;
    const b = find(x, rising).fronts[0]!;
    expect(b.position_m).toBeCloseTo(a.position_m, 10);
    expect(b.width_m).toBeCloseTo(a.width_m!, 10);
    expect(b.slope_K_m).toBeCloseTo(-a.slope_K_m, 8);
  });

  it('calls a bed uniform where it spans less than a tenth of the range, even around one half', () => {
    expect(
      find(
        x,
        profile(x, () => 0.5),
      ).reason,
    ).toBe('uniform');
    expect(
      find(
        x,
        profile(x, (v) => 0.46 + 0.016 * v),
      ).reason,
    ).toBe('uniform');
    expect(
      find(
        x,
        profile(x, () => 0.5),
      ).fronts,
    ).toEqual([]);
  });

  it('says that nothing passes one half where the profile stays on one side', () => {
    expect(
      find(
        x,
        profile(x, (v) => 0.05 + 0.08 * v),
      ).reason,
    ).toBe('no_half_crossing');
    expect(
      find(
        x,
        profile(x, (v) => 0.6 + 0.08 * v),
      ).reason,
    ).toBe('no_half_crossing');
  });

  it('gives no width where 16 % or 84 % is not in the bed, and extrapolates nothing', () => {
    const young = find(
      x,
      profile(x, (v) => 0.7 - 0.5 * v + (v > 1.4 ? 0.5 * (v - 1.4) : 0)),
    ).fronts[0]!;
    expect(young.crossing84).toBeNull();
    expect(young.width_m).toBeNull();
    expect(young.position_m).toBeCloseTo(0.4, 10);
  });

  it('lists several fronts by x, each with the width of its own piece', () => {
    // Hot, cold, hot, cold: charged, discharged from the wrong end, charged again.
    const T = profile(x, (v) => 0.5 + 0.5 * Math.cos((v / 5) * 3 * Math.PI));
    const { fronts } = find(x, T);
    expect(fronts.map((f) => Math.sign(f.slope_K_m))).toEqual([-1, 1, -1]);
    // cos crosses zero at thirds of half waves: 5/6, 15/6, 25/6 m; straight lines between cells
    // of 0.05 m err by at most (dx^2/8) |theta''|/|theta'|, which vanishes at the inflexion: 1e-4.
    [5 / 6, 15 / 6, 25 / 6].forEach((p, i) => {
      expect(Math.abs(fronts[i]!.position_m - p)).toBeLessThan(1e-4);
    });
    for (const front of fronts) expect(front.width_m).not.toBeNull();
  });

  it('does not count a wobble below a tenth of the range as a front, nor a turn', () => {
    const points = [1, 0.9, 0.53, 0.48, 0.52, 0.47, 0.1, 0];
    const xs = Float64Array.from(points.keys());
    const { fronts } = find(
      xs,
      profile(xs, (v) => points[v]!),
    );
    expect(fronts).toHaveLength(1);
    expect(fronts[0]!.slope_K_m).toBeLessThan(0);
    expect(fronts[0]!.crossing84!.index).toBe(1);
    expect(fronts[0]!.crossing16!.index).toBe(5);
  });

  it('counts a piece from one half on only where it spans a tenth', () => {
    const points = [0.1, 0.1, 0.54, 0.49, 0.53, 0.9];
    const xs = Float64Array.from(points.keys());
    expect(
      find(
        xs,
        profile(xs, (v) => points[v]!),
      ).fronts,
    ).toHaveLength(1);
    const dip = [0.9, 0.45, 0.56, 0.1];
    const xd = Float64Array.from(dip.keys());
    expect(
      find(
        xd,
        profile(xd, (v) => dip[v]!),
      ).fronts,
    ).toHaveLength(3);
  });

  it('refuses misuse by name', () => {
    expect(() => findFronts(x, x.slice(1), TH, TC)).toThrow(/temperature_K has 99/);
    expect(() => findFronts(x, x, TC, TH)).toThrow(/reference_hot_K 298.15/);
    const broken = profile(x, () => 0.5);
    broken[7] = Number.NaN;
    expect(() => find(x, broken)).toThrow(/temperature_K\[7\] is NaN/);
    expect(() => find(Float64Array.of(1, 1), Float64Array.of(TH, TC))).toThrow(/x_m\[1\]/);
  });

  it('holds its invariants on any profile', () => {
    fc.assert(
      fc.property(
        fc.array(fc.double({ min: -0.3, max: 1.3, noNaN: true }), { minLength: 2, maxLength: 60 }),
        (theta) => {
          const xs = Float64Array.from(theta.keys());
          const T = Float64Array.from(theta, at);
          const { fronts, reason } = find(xs, T);
          expect(fronts.length === 0).toBe(reason !== null);
          let last = Number.NEGATIVE_INFINITY;
          for (const front of fronts) {
            expect(front.position_m).toBeGreaterThanOrEqual(last);
            last = front.position_m;
            expect(front.span).toBeGreaterThanOrEqual(0.1 - 1e-12);
            expect(front.width_m === null || front.width_m > 0).toBe(true);
            const { index, weight } = front.crossing50;
            const back = T[index]! * (1 - weight) + T[index + 1]! * weight;
            expect(Math.abs(back - at(0.5))).toBeLessThan(1e-9);
          }
          // Neighbouring fronts of one profile run in opposite senses: pieces alternate, and a
          // piece without a crossing lies wholly on one side.
          for (let i = 1; i < fronts.length; i++)
            expect(fronts[i]!.slope_K_m * fronts[i - 1]!.slope_K_m).toBeLessThan(0);
        },
      ),
      { seed: 7, numRuns: 500 },
    );
  });
});

describe('fronts of a measured profile (Pacheco et al. 2002, straight lines between the points)', () => {
  // Published values to three decimals, as the fixture's source states them; charged at the top.
  const cases = [
    { time: 0, position: 0.845, width: null },
    { time: 0.5, position: 1.82, width: 0.739 },
    { time: 1, position: 2.679, width: 0.959 },
  ];
  const rows = fixtureRows('sandia_pacheco2002_discharge_measured.csv');
  it.each(cases)('at $time h', ({ time, position, width }) => {
    const points = rows
      .filter((row) => numberIn(row, 'time_h') === time)
      .map((row) => [numberIn(row, 'height_m'), numberIn(row, 'temperature_C')] as const)
      .sort((a, b) => a[0] - b[0]);
    const { fronts } = findFronts(
      Float64Array.from(points, (p) => p[0]),
      Float64Array.from(points, (p) => p[1] + 273.15),
      396 + 273.15,
      290 + 273.15,
    );
    expect(fronts).toHaveLength(1);
    expect(Math.abs(fronts[0]!.position_m - position)).toBeLessThan(0.0006);
    if (width === null) expect(fronts[0]!.width_m).toBeNull();
    else expect(Math.abs(fronts[0]!.width_m! - width)).toBeLessThan(0.0006);
  });
});

describe('sigmas of a front', () => {
  const x = centres(40, 4);
  const T = profile(x, (v) => 0.5 - 0.5 * Math.tanh((v - 1.73) / 0.5));
  const front = find(x, T).fronts[0]!;

  it('agree with finite differences of the crossings', () => {
    const step = 1e-3;
    for (const key of ['crossing50', 'crossing16', 'crossing84'] as const) {
      const derivative = crossingDerivative(front[key]!);
      const ends = [derivative.left_m_K, derivative.right_m_K];
      for (const side of [0, 1] as const) {
        const moved = [1, -1].map((sign) => {
          const shifted = T.slice();
          shifted[derivative.index + side]! += sign * step;
          return find(x, shifted).fronts[0]![key]!.x_m;
        });
        const numeric = (moved[0]! - moved[1]!) / (2 * step);
        // Central difference: error (step^2/6) x''' with x''' ~ x'/(T_i - T_j)^2 ~ x'/400 K2.
        expect(Math.abs(numeric - ends[side]!)).toBeLessThan(1e-7 * Math.abs(ends[side]!) + 1e-10);
      }
    }
  });

  it('give sigma_T over the slope for fully shared errors, and no width error then but shift', () => {
    const sigma = frontSigma(front, () => 4);
    expect(sigma.position_sigma_m).toBeCloseTo(2 / Math.abs(front.slope_K_m), 12);
    const low = 2 / Math.abs(front.crossing16!.slope_K_m);
    const high = 2 / Math.abs(front.crossing84!.slope_K_m);
    expect(sigma.width_sigma_m).toBeCloseTo(Math.abs(high - low) / 2, 12);
  });

  it('give the root of the summed squares for independent errors', () => {
    const sigma = frontSigma(front, (i, j) => (i === j ? 4 : 0));
    const { weight, slope_K_m } = front.crossing50;
    expect(sigma.position_sigma_m).toBeCloseTo(
      (2 * Math.hypot(weight, 1 - weight)) / Math.abs(slope_K_m),
      12,
    );
    expect(sigma.width_sigma_m).toBeGreaterThan(0);
  });

  it('are null for a width that is not there, and refuse what is no covariance', () => {
    const short = find(
      x,
      profile(x, (v) => 0.7 - 0.1 * v),
    ).fronts[0]!;
    expect(frontSigma(short, (i, j) => (i === j ? 1 : 0)).width_sigma_m).toBeNull();
    expect(() => frontSigma(front, () => -1)).toThrow(RangeError);
    expect(() => frontSigma(front, () => Number.NaN)).toThrow(RangeError);
  });
});

describe('energy-equivalent position', () => {
  it('is the length times the mean share of enthalpy, unclamped, and the same for a cold store', () => {
    const cells = Float64Array.of(110, 100, 60, 0);
    expect(energyPosition(cells, 0.5, 100, 0)).toBeCloseTo((0.5 * 270) / 100, 14);
    expect(energyPosition(Float64Array.of(-10, 0, 40, 100), 0.5, 0, 100)).toBeCloseTo(1.35, 14);
    expect(energyPosition(cells, Float64Array.of(1, 1, 0, 2), 100, 0)).toBeCloseTo(2.1, 14);
  });

  it('refuses references without a span and cells that do not match', () => {
    expect(() => energyPosition(Float64Array.of(1), 1, 5, 5)).toThrow(/span nothing/);
    expect(() => energyPosition(Float64Array.of(1), Float64Array.of(1, 2), 5, 6)).toThrow(/cell_m/);
  });
});
