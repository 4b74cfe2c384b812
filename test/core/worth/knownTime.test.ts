import { describe, expect, it } from 'vitest';
import { hotBed, hotStore, modelOf, stringOf } from '../track/plants.js';
import { courseThrough, frontAt, weighed } from './courses.js';

/** A steel wall beside the rim string: after a start nobody knows what heat is in it. */
const MODEL = modelOf(
  hotStore({
    bed: hotBed({ wall_capacity_J_m2K: 8e4 }),
    strings: [
      stringOf('a', 8, 4, { area_share: 0.5 }),
      stringOf('b', 8, 4, { area_share: 0.5, radius_m: 0.9 }),
    ],
  }),
);
const STAND = {
  massFlux_kg_m2s: 0,
  inlet_K: 733.15,
  inletSigma_K: 0,
  ambient_K: 288.15,
  dt_s: 300,
  travelSigma_m: 0,
};
const DAY_S = 86_400;

/** Sigma of the state of charge over an hour of which each step tells how long the profile is known. */
function sigma(known_s: (n: number) => number | null): number {
  const course = courseThrough(frontAt(MODEL, 0.4), Array(12).fill(STAND));
  const steps = course.steps.map((step, n) => {
    const known = known_s(n);
    return known === null ? step : { ...step, known_s: [known] };
  });
  return weighed(MODEL, { ...course, steps }).all.soc_sigma_rms;
}

describe('a course along which the profile was drawn anew', () => {
  it('is as uncertain as the estimate of a store whose wall is known for no longer', () => {
    const always = sigma((n) => 30 * DAY_S + 300 * n);
    const anew = sigma((n) => (n < 2 ? 30 * DAY_S + 300 * n : 300 * (n - 1)));
    const start = sigma(() => null);
    expect(anew).toBeGreaterThan(1.02 * always);
    // A course that records nothing begins with nothing known and goes on from there.
    expect(start).toBe(sigma((n) => 300 * (n + 1)));
    expect(anew).toBeLessThan(start);
  });
});
