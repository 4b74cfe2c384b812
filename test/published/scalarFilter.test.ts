import { describe, expect, it } from 'vitest';
import { type ScalarState, stepScalar } from '../../src/core/track/scalarFilter.js';

/**
 * Annual flow of the Nile at Aswan 1871-1970 [1e8 m3]. Source: Cobb, Biometrika 65 (1978) 243; the
 * series of R's data set `Nile`, written from memory and found to agree with public copies of it.
 */
const NILE = [
  1120, 1160, 963, 1210, 1160, 1160, 813, 1230, 1370, 1140, 995, 935, 1110, 994, 1020, 960, 1180,
  799, 958, 1140, 1100, 1210, 1150, 1250, 1260, 1220, 1030, 1100, 774, 840, 874, 694, 940, 833, 701,
  916, 692, 1020, 1050, 969, 831, 726, 456, 824, 702, 1120, 1100, 832, 764, 821, 768, 845, 864, 862,
  698, 845, 744, 796, 1040, 759, 781, 865, 845, 944, 984, 897, 822, 1010, 771, 676, 649, 846, 812,
  742, 801, 1040, 860, 874, 848, 890, 744, 749, 838, 1050, 918, 986, 797, 923, 975, 815, 1020, 906,
  901, 1170, 912, 746, 919, 718, 714, 740,
];
/** Durbin & Koopman, Time Series Analysis by State Space Methods, local-level model. */
const EPSILON = 15099;
const ETA = 1469.1;

/** One-step prediction errors and their variances, started from the first value (diffuse). */
function predictions(): { error: number; variance: number; gain: number; state: ScalarState }[] {
  let state: ScalarState = { mean: NILE[0]!, variance: EPSILON };
  return NILE.slice(1).map((value) => {
    const variance = state.variance + ETA + EPSILON;
    const error = value - state.mean;
    const measurement = { mean: value, variance: EPSILON };
    state = stepScalar(state, { change: 0, processVariance: ETA, measurement });
    return { error, variance, gain: state.variance / EPSILON, state };
  });
}

describe('local-level model on the Nile series (Durbin & Koopman)', () => {
  it('settles at the gain 0.267 [M], the root of the stationary Riccati equation', () => {
    // P/r = K for the updated variance. Stationary: x^2 = q x + q with x = P'/r, K = x/(1 + x).
    const q = ETA / EPSILON;
    const x = (q + Math.sqrt(q * q + 4 * q)) / 2;
    const gain = predictions().at(-1)!.gain;
    // The gain's error shrinks by (1 - K)^2 a step: 0.537^99 is far below round-off.
    expect(gain).toBeCloseTo(x / (1 + x), 12);
    expect(Math.abs(gain - 0.267)).toBeLessThan(0.0005); // the published three digits
  });

  it('reaches the diffuse log likelihood -632.55 [M]', () => {
    const sum = predictions().reduce(
      (total, { error, variance }) =>
        total - 0.5 * (Math.log(2 * Math.PI * variance) + (error * error) / variance),
      0,
    );
    expect(Math.abs(sum - -632.55)).toBeLessThan(0.005); // two published decimals
  });

  it('agrees at every year with exponential weights written out as one sum', () => {
    // Independent of any recursion on the mean: weights w_j = K_j prod_{i>j} (1 - K_i).
    const gains = [1, ...predictions().map((p) => p.gain)];
    predictions().forEach(({ state }, year) => {
      let keep = 1;
      let mean = 0;
      for (let j = year + 1; j >= 0; j--) {
        mean += gains[j]! * keep * NILE[j]!;
        keep *= 1 - gains[j]!;
      }
      // 100 terms of order 1000 at 1e-16 each.
      expect(Math.abs(state.mean - mean)).toBeLessThan(1e-10);
    });
  });
});
