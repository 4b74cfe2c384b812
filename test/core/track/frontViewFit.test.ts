import fc from 'fast-check';
import { levenbergMarquardt } from 'ml-levenberg-marquardt';
import { describe, expect, it } from 'vitest';
import {
  type FrontFit,
  type FrontReading,
  fitFront,
  type NoFrontFit,
} from '../../../src/core/track/frontViewFit.js';
import {
  COLD,
  type ErfFront,
  erf,
  HOT,
  halfCrossing,
  LENGTH,
  normals,
  places,
  temperatureOf,
  uniforms,
  widthOf,
} from './frontViewStrings.js';

const HOT_STORE = { charged_K: HOT, discharged_K: COLD };

function readingsOf(front: ErfFront, n: number, sigma: number, noise = () => 0): FrontReading[] {
  return places(n).map((x) => ({
    x_m: x,
    temperature_K: temperatureOf(front, x) + sigma * noise(),
    sigma_K: sigma,
  }));
}
function seen(fit: FrontFit | NoFrontFit): FrontFit {
  if (!fit.seen) throw new Error(`no front: ${fit.reason}`);
  return fit;
}
/** A front skewed by the transform of Jones & Pewsey, written with its own functions. */
function skewed({ p, w, A, B }: ErfFront, e: number, x: number): number {
  const z = Math.sinh(Math.asinh((x - p) / w) + e);
  return A + (B - A) * 0.5 * (1 + erf(z / Math.SQRT2));
}
/** Where a falling curve passes theta of HOT and COLD. */
function crossing(curve: (x: number) => number, theta: number): number {
  let low = -5;
  let high = 10;
  for (let i = 0; i < 70; i++) {
    const middle = 0.5 * (low + high);
    if (curve(middle) > COLD + theta * (HOT - COLD)) low = middle;
    else high = middle;
  }
  return low;
}
const reasonOf = (fit: FrontFit | NoFrontFit) => (fit.seen ? null : fit.reason);

describe('fit of a front', () => {
  const front: ErfFront = { p: 2.13, w: 0.4, A: HOT, B: COLD };

  it('recovers an erf front without noise, at the charged end of a hot and of a cold store', () => {
    const fit = seen(fitFront(readingsOf(front, 14, 1e-3), HOT_STORE));
    // Bias of the priors: (sigma_fit/sigma_prior)^2 of their distance, here (1e-6)^2; the steps end
    // a thousandth of a sigma from the minimum, sigma_fit being about 1e-6 m.
    expect(Math.abs(fit.position_m - 2.13)).toBeLessThan(1e-8);
    expect(Math.abs(fit.width_m! - widthOf(front))).toBeLessThan(1e-8);
    expect(Math.abs(fit.hot_plateau_K - HOT)).toBeLessThan(1e-5);
    expect(Math.abs(fit.cold_plateau_K - COLD)).toBeLessThan(1e-5);

    const mirrored = readingsOf({ ...front, A: COLD, B: HOT }, 14, 1e-3);
    const cold = seen(fitFront(mirrored, { charged_K: COLD, discharged_K: HOT }));
    expect(Math.abs(cold.position_m - 2.13)).toBeLessThan(1e-8);
    expect(Math.abs(cold.width_m! - widthOf(front))).toBeLessThan(1e-8);
    expect(Math.abs(cold.hot_plateau_K - HOT)).toBeLessThan(1e-5);
  });

  it('agrees with ml-levenberg-marquardt on the same readings and priors', () => {
    const reach = (LENGTH * 13) / 14;
    const [narrow, wide] = [(0.25 * reach) / 13, 0.5 * reach];
    const range = HOT - COLD;
    // A prior is a datum: the parameter itself, with the prior's mean and sigma, at a made-up x.
    const priors = [
      { value: 0.5 * Math.log(narrow * wide), sigma: 0.5 * Math.log(wide / narrow) },
      { value: HOT, sigma: 0.1 * range },
      { value: COLD, sigma: 0.1 * range },
      { value: 0, sigma: 0.15 },
    ];
    for (let seed = 1; seed <= 10; seed++) {
      const readings = readingsOf(front, 14, 2, normals(seed));
      const fit = seen(fitFront(readings, HOT_STORE));
      const other = levenbergMarquardt(
        {
          x: [...readings.map((r) => r.x_m), ...priors.map((_, k) => 1000 + k)],
          y: [
            ...readings.map((r) => r.temperature_K / 2),
            ...priors.map(({ value, sigma }) => value / sigma),
          ],
        },
        (parameters) => {
          const [p, logW, A, B, e] = parameters as [number, number, number, number, number];
          return (x: number) =>
            x < 1000
              ? skewed({ p, w: Math.exp(logW), A, B }, e, x) / 2
              : parameters[x - 999]! / priors[x - 1000]!.sigma;
        },
        {
          initialValues: [2, Math.log(0.5), HOT - 10, COLD + 10, 0.1],
          maxIterations: 300,
          errorTolerance: 1e-12,
          damping: 1e-3,
          gradientDifference: 1e-5,
          centralDifference: true,
        },
      );
      const [p, logW, A, B, e] = other.parameterValues as [number, number, number, number, number];
      const curve = (x: number) => skewed({ p, w: Math.exp(logW), A, B }, e, x);
      const half = 0.5 * (crossing(curve, 0.16) - crossing(curve, 0.84));
      // The steps of the fit end a thousandth of a sigma from the minimum; the other's derivatives are
      // differences, good to 1e-5 of themselves, which does not move a minimum by more.
      const sigma = (k: number) => Math.sqrt(fit.covariance[5 * k]!);
      expect(Math.abs(fit.position_m - crossing(curve, 0.5))).toBeLessThan(2e-3 * sigma(0));
      expect(Math.abs(fit.width_m! - half)).toBeLessThan(2e-3 * sigma(1));
      expect(Math.abs(fit.hot_plateau_K - A)).toBeLessThan(2e-3 * sigma(2));
      expect(Math.abs(fit.cold_plateau_K - B)).toBeLessThan(2e-3 * sigma(3));
    }
  });

  it('follows a skewed front, which an erf alone would put off by a tenth of its width', () => {
    for (const e of [-0.4, -0.2, 0.2, 0.4]) {
      const curve = (x: number) => skewed({ ...front, p: 2.4, w: 0.7 }, e, x);
      const readings = places(14).map((x) => ({
        x_m: x,
        temperature_K: curve(x),
        sigma_K: 0.01,
      }));
      const fit = seen(fitFront(readings, HOT_STORE));
      // The prior on the skew pulls by (1e-4/0.15)^2 of it; sigma of the fit is 2e-5 m.
      expect(Math.abs(fit.position_m - crossing(curve, 0.5))).toBeLessThan(1e-5);
      const half = 0.5 * (crossing(curve, 0.16) - crossing(curve, 0.84));
      expect(Math.abs(fit.width_m! - half)).toBeLessThan(1e-5);
    }
  });

  it('gives the position by the references of the store, not by its own plateaus', () => {
    const low: ErfFront = { p: 2, w: 0.5, A: HOT - 90, B: COLD + 10 };
    const fit = seen(fitFront(readingsOf(low, 20, 1e-3), HOT_STORE));
    expect(Math.abs(fit.position_m - halfCrossing(low))).toBeLessThan(1e-6);
    expect(halfCrossing(low)).toBeLessThan(1.95);
    expect(Math.abs(fit.hot_plateau_K - (HOT - 90))).toBeLessThan(1e-4);
  });

  it('recovers random fronts through noise and missing sensors within its standard errors', () => {
    const random = uniforms(2024);
    const noise = normals(77);
    let squares = 0;
    let widthSquares = 0;
    let fits = 0;
    const trials = 1500;
    for (let k = 0; k < trials; k++) {
      const n = 10 + Math.floor(8 * random());
      const truth: ErfFront = {
        p: 1.5 + 2 * random(),
        w: (LENGTH / n) * (0.8 + random()),
        A: HOT + 15 * noise(),
        B: COLD + 15 * noise(),
      };
      const sigma = 0.3 + 3 * random();
      const readings = readingsOf(truth, n, sigma, noise).map((r) =>
        random() < 0.1 ? { ...r, temperature_K: Number.NaN } : r,
      );
      const fit = fitFront(readings, HOT_STORE);
      if (!fit.seen || fit.width_m === null) continue;
      fits++;
      const z = (fit.position_m - halfCrossing(truth)) / Math.sqrt(fit.covariance[0]!);
      const zw = (fit.width_m - widthOf(truth)) / Math.sqrt(fit.covariance[5]!);
      squares += z * z;
      widthSquares += zw * zw;
      // Of 3000 normal numbers one passes 4.8 once in 200 such tests; the fit is not linear: 6.
      expect(Math.abs(z)).toBeLessThan(6);
      expect(Math.abs(zw)).toBeLessThan(6);
    }
    expect(fits).toBeGreaterThan(0.95 * trials);
    // Mean square of n normal numbers: 1 +/- sqrt(2/n), four of which are 0.15. The inflation by
    // the misfit only grows the sigmas: for 6 to 14 degrees of freedom its mean is 1.2.
    for (const mean of [squares / fits, widthSquares / fits]) {
      expect(mean).toBeLessThan(1.15);
      expect(mean).toBeGreaterThan(0.85 / 1.2);
    }
  });

  it('never gives NaN, and always a symmetric covariance that is one, whatever is read', () => {
    fc.assert(
      fc.property(
        fc.array(
          fc.record({
            x_m: fc.integer({ min: 0, max: 1000 * LENGTH }).map((mm) => mm / 1000),
            temperature_K: fc.oneof(
              fc.double({ min: 100, max: 1200, noNaN: true }),
              fc.constant(Number.NaN),
            ),
            sigma_K: fc.double({ min: 0.01, max: 20, noNaN: true }),
            lasting_K: fc.double({ min: 0, max: 5, noNaN: true }),
            place_m: fc.double({ min: 0, max: 0.05, noNaN: true }),
          }),
          { maxLength: 20 },
        ),
        (readings) => {
          const fit = fitFront(readings, HOT_STORE);
          if (!fit.seen) return;
          const x = readings.filter((r) => Number.isFinite(r.temperature_K)).map((r) => r.x_m);
          expect(fit.position_m).toBeGreaterThanOrEqual(Math.min(...x));
          expect(fit.position_m).toBeLessThanOrEqual(Math.max(...x));
          if (fit.width_m !== null) expect(fit.width_m).toBeGreaterThan(0);
          for (const matrix of [fit.covariance, fit.white]) {
            for (let a = 0; a < 4; a++) {
              expect(matrix[5 * a]).toBeGreaterThanOrEqual(0);
              for (let b = 0; b < 4; b++) {
                const value = matrix[4 * a + b]!;
                expect(Number.isFinite(value)).toBe(true);
                expect(value).toBe(matrix[4 * b + a]);
                const most = Math.sqrt(matrix[5 * a]! * matrix[5 * b]!);
                expect(Math.abs(value)).toBeLessThanOrEqual(most * (1 + 1e-9));
              }
            }
          }
          // What is new with every scan is part of the whole.
          for (const k of [0, 5, 10, 15])
            expect(fit.white[k]!).toBeLessThanOrEqual(fit.covariance[k]! * (1 + 1e-9));
        },
      ),
      { seed: 3, numRuns: 1500 },
    );
  });

  it('sees a front between two sensors without a width, and says where it can be', () => {
    const random = uniforms(9);
    const noise = normals(10);
    for (let k = 0; k < 300; k++) {
      const truth: ErfFront = { p: 1 + 3 * random(), w: 0.02, A: HOT, B: COLD };
      const fit = seen(fitFront(readingsOf(truth, 10, 1, noise), HOT_STORE));
      expect(fit.width_m).toBeNull();
      // Within the interval, half of which is sqrt(3) sigmas; a reading in the steep part adds noise.
      const sigma = Math.sqrt(fit.covariance[0]!);
      expect(Math.abs(fit.position_m - truth.p)).toBeLessThan(2.5 * sigma);
      expect(sigma).toBeLessThanOrEqual(0.5 / Math.sqrt(12) + 0.01);
      expect([...fit.covariance.slice(4, 8)]).toEqual([0, 0, 0, 0]);
    }
  });

  it('narrows the interval where one sensor stands in the front', () => {
    const [, , , , x4] = places(10);
    const truth: ErfFront = { p: x4! + 0.02, w: 0.05, A: HOT, B: COLD };
    const fit = seen(fitFront(readingsOf(truth, 10, 0.5), HOT_STORE));
    expect(fit.width_m).toBeNull();
    expect(Math.sqrt(fit.covariance[0]!)).toBeLessThan(0.05);
    expect(Math.abs(fit.position_m - truth.p)).toBeLessThan(2 * Math.sqrt(fit.covariance[0]!));
  });

  it('leaves out one reading that is wrong, wherever it stands, and says so', () => {
    for (let i = 1; i < 13; i++) {
      const readings = readingsOf(front, 14, 0.5, normals(4));
      readings[i] = { ...readings[i]!, temperature_K: readings[i]!.temperature_K - 60 };
      const fit = seen(fitFront(readings, HOT_STORE));
      expect(fit.left_out).toBe(1);
      expect(Math.abs(fit.position_m - 2.13)).toBeLessThan(4 * Math.sqrt(fit.covariance[0]!));
      expect(Math.abs(fit.width_m! - widthOf(front))).toBeLessThan(
        4 * Math.sqrt(fit.covariance[5]!),
      );
    }
  });

  it('grows its sigmas where the front has another shape, and keeps all readings then', () => {
    // Two fronts that have not run together: a landing at 60 % between them.
    const stairs = (x: number) =>
      COLD +
      (HOT - COLD) *
        (1 - 0.4 * 0.5 * (1 + erf((x - 1.2) / 0.25)) - 0.6 * 0.5 * (1 + erf((x - 2.9) / 0.35)));
    const readings = places(14).map((x) => ({ x_m: x, temperature_K: stairs(x), sigma_K: 0.5 }));
    const fit = seen(fitFront(readings, HOT_STORE));
    expect(fit.left_out).toBe(0);
    expect(fit.misfit).toBeGreaterThan(50);
    expect(Math.abs(fit.position_m - crossing(stairs, 0.5))).toBeLessThan(
      3 * Math.sqrt(fit.covariance[0]!),
    );
    // A single scan's noise does not explain it: the white part stays what the noise makes of it.
    expect(fit.white[0]).toBeLessThan(0.05 * fit.covariance[0]!);
  });

  it.each([
    [0.5, 0.4, 1.6, 1],
    [0.6, 0.4, 1.4, 1.5],
    [0.45, 0.5, 1.3, 1.5],
    [0.5, 0.3, 2, 0.5],
  ])(
    'stays within its sigmas as a new front of share %f and %f m runs into one of %f m, %f m ahead',
    (share, narrow, wide, ahead) => {
      const phi = (z: number) => 0.5 * (1 + erf(z / Math.SQRT2));
      for (let p = 0.4; p < 5; p += 0.05) {
        const curve = (x: number) =>
          HOT -
          (HOT - COLD) *
            (share * phi((x - p) / narrow) + (1 - share) * phi((x - p - ahead) / wide));
        const readings = Array.from({ length: 14 }, (_, i) => ({
          x_m: 0.45 + 0.64 * i,
          temperature_K: curve(0.45 + 0.64 * i),
          ...{ sigma_K: 0.5, lasting_K: 1.1, place_m: 0.01 },
        }));
        const fit = fitFront(readings, HOT_STORE);
        if (!fit.seen) continue;
        // The front view adds 0.025 of the width for fronts of other shapes.
        const sigma = Math.hypot(Math.sqrt(fit.covariance[0]!), 0.025 * (fit.scale_m ?? 0));
        expect(Math.abs(fit.position_m - crossing(curve, 0.5)) / sigma, `at ${p}`).toBeLessThan(2);
      }
    },
  );

  it('settles, and takes no wide front for one between two sensors, in readings of such a charge', () => {
    // Recorded on the finer plant, 5 min apart [degC]: fits of these did not settle, and the place of a
    // narrow front was given, which stood still with 0.02 m for its sigma.
    const scans = [
      [425.3, 323.9, 245.4, 163.3, 100.6, 60.5, 38.6, 31.1, 28.1, 25.5, 24.9, 25.5, 28.3, 28.4],
      [434.8, 333.0, 256.0, 173.6, 108.9, 65.4, 41.2, 32.3, 28.7, 25.5, 24.8, 25.6, 28.5, 28.5],
      [442.1, 343.0, 265.8, 184.5, 117.3, 70.8, 44.0, 33.5, 28.8, 25.6, 24.7, 25.3, 28.2, 28.3],
      [447.4, 354.0, 275.3, 195.2, 126.0, 76.9, 47.0, 35.1, 29.4, 26.0, 24.8, 25.3, 28.1, 28.1],
      [450.8, 365.2, 283.9, 205.3, 134.6, 82.2, 50.4, 36.5, 30.3, 26.1, 24.9, 25.5, 28.2, 28.1],
    ];
    const found = scans.map((scan) => {
      const readings = scan.map((degC, i) => ({
        x_m: 0.45 + 0.64 * i,
        temperature_K: degC + 273.15,
        ...{ sigma_K: 0.5, lasting_K: 1.1, place_m: 0.01 },
      }));
      return seen(fitFront(readings, { charged_K: 733.15, discharged_K: 298.15 }));
    });
    for (const fit of found) expect(fit.width_m).toBeGreaterThan(1.1);
    // It went 0.08 m in 10 min.
    found.slice(1).forEach((fit, k) => {
      expect(Math.abs(fit.position_m - found[k]!.position_m - 0.08)).toBeLessThan(0.02);
    });
  });

  it('never leaves out the first or the last reading: a new front may be entering there', () => {
    const readings = readingsOf(front, 14, 0.5, normals(4));
    for (const [i, off] of [
      [0, -60],
      [13, 60],
    ] as const) {
      const changed = readings.map((r, k) =>
        k === i ? { ...r, temperature_K: r.temperature_K + off } : r,
      );
      const fit = seen(fitFront(changed, HOT_STORE));
      expect(fit.left_out).toBe(0);
      expect(Math.abs(fit.position_m - 2.13)).toBeLessThan(2 * Math.sqrt(fit.covariance[0]!));
    }
  });

  it('splits its covariance in what is new with each scan and what stays', () => {
    const readings = readingsOf(front, 14, 0.5).map((r) => ({
      ...r,
      lasting_K: 1.5,
      place_m: 0.01,
    }));
    const fit = seen(fitFront(readings, HOT_STORE));
    const noise = normals(5);
    let squares = 0;
    const scans = 800;
    for (let k = 0; k < scans; k++) {
      const again = readings.map((r) => ({ ...r, temperature_K: r.temperature_K + 0.5 * noise() }));
      squares += (seen(fitFront(again, HOT_STORE)).position_m - fit.position_m) ** 2;
    }
    // Scatter over scans is the white part: mean square of 800 normal numbers 1 +/- 0.05, four of it.
    expect(squares / scans / fit.white[0]!).toBeGreaterThan(0.8);
    expect(squares / scans / fit.white[0]!).toBeLessThan(1.2);
    expect(fit.covariance[0]).toBeGreaterThan(3 * fit.white[0]!);
  });

  it('takes readings in any order, and two sensors at one place', () => {
    const readings = readingsOf(front, 14, 1, normals(8));
    const straight = seen(fitFront(readings, HOT_STORE));
    const shuffled = seen(fitFront([...readings].reverse(), HOT_STORE));
    expect(shuffled).toEqual(straight);
    const double = seen(fitFront([...readings, readings[5]!], HOT_STORE));
    expect(double.covariance[0]).toBeLessThan(straight.covariance[0]!);
  });

  it('says why there is none', () => {
    const at = (values: number[]) =>
      fitFront(
        values.map((temperature_K, x_m) => ({ x_m, temperature_K, sigma_K: 1 })),
        HOT_STORE,
      );
    expect(reasonOf(at([700, 300]))).toBe('too_few_readings');
    expect(reasonOf(at([700, Number.NaN, Number.NaN, 300]))).toBe('too_few_readings');
    expect(reasonOf(at([500, 510, 505, 500]))).toBe('uniform');
    expect(reasonOf(at([773, 773, 700, 640]))).toBe('no_half_crossing');
    expect(reasonOf(at([773, 300, 300, 770, 300]))).toBe('several_fronts');
    expect(reasonOf(at([300, 310, 760, 770]))).toBe('reversed');
    expect(reasonOf(fitFront([], HOT_STORE))).toBe('too_few_readings');
  });

  it('refuses misuse by name', () => {
    const one = [{ x_m: 0, temperature_K: 1, sigma_K: 1 }];
    expect(() => fitFront(one, { charged_K: 300, discharged_K: 300 })).toThrow(/charged_K/);
    const bad = (change: object) => () =>
      fitFront(
        readingsOf(front, 5, 1).map((r) => ({ ...r, ...change })),
        HOT_STORE,
      );
    expect(bad({ sigma_K: 0 })).toThrow(/sigma_K.*0/);
    expect(bad({ lasting_K: -1 })).toThrow(/lasting_K.*-1/);
    expect(bad({ x_m: Number.NaN })).toThrow(/x_m.*NaN/);
  });
});
