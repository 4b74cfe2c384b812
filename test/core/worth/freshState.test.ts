import { describe, expect, it } from 'vitest';
import { blankTube } from '../../../src/core/track/start.js';
import { freshState } from '../../../src/core/worth/freshState.js';
import { hotStore, modelOf, stringOf } from '../track/plants.js';
import { courseThrough, frontAt, weighed } from './courses.js';

const MODEL = modelOf(
  hotStore({
    strings: [
      stringOf('a', 8, 4, { area_share: 0.5 }),
      stringOf('b', 8, 4, { area_share: 0.5, radius_m: 0.6 }),
    ],
  }),
);
const { size, cells } = MODEL.tubes[1]!.layout;
const START = frontAt(MODEL, 0.4);
const lostOf = (count: number) =>
  new Set(Array.from({ length: count }, (_, i) => `b_${i + 1}`)) as ReadonlySet<string>;

describe('where a course begins with nothing known', () => {
  it('a tube without a thermocouple in use knows what the other strings read', () => {
    const state = freshState(MODEL, START, lostOf(8));
    const blank = blankTube(MODEL.tubes[1]!);
    state.tubes.forEach(({ enthalpy }, k) => {
      expect(enthalpy).toEqual(START[k]);
    });
    expect(state.tubes[0]!.covariance).toEqual(blankTube(MODEL.tubes[0]!).covariance);
    // Between thermocouples the room is a quarter of their step at most, beyond the last of them,
    // which stand a quarter of a metre from the ends, 0.3 (1 - exp(-0.25)) of the span; noise and
    // offsets besides.
    const sigma = (p: Float64Array, i: number) => Math.sqrt(p[i * size + i]!);
    const span = 733.15 - 298.15;
    for (let i = 0; i < cells; i++) {
      expect(sigma(blank.covariance, i)).toBeCloseTo(span / 2, 6);
      expect(sigma(state.tubes[1]!.covariance, i)).toBeLessThan(span / 4 + 2);
    }
    for (const i of [cells - 1, cells - 5]) {
      expect(sigma(state.tubes[1]!.covariance, i)).toBeLessThan(
        0.3 * (1 - Math.exp(-0.25)) * span + 2,
      );
    }
  });

  it('one thermocouple alone tells itself within what the other strings read, as at a start', () => {
    const tube = MODEL.tubes[1]!;
    const blank = blankTube(tube);
    const alone = freshState(MODEL, START, lostOf(7)).tubes[1]!;
    const none = freshState(MODEL, START, lostOf(8)).tubes[1]!;
    const sigma = (p: Float64Array, i: number) => Math.sqrt(p[i * size + i]!);
    for (let i = 0; i < cells; i++) {
      expect(sigma(alone.covariance, i)).toBeLessThan(sigma(blank.covariance, i) / 1.9);
    }
    // Its own offset goes with the profile that was drawn through it; that of one not read does not.
    const { offset } = tube.layout;
    const shared = (p: Float64Array, s: number) =>
      Math.max(...Array.from({ length: cells }, (_, i) => Math.abs(p[i * size + offset + s]!)));
    expect(shared(alone.covariance, 7)).toBeGreaterThan(0);
    for (const p of [none.covariance, blank.covariance]) expect(shared(p, 7)).toBe(0);
    expect(shared(alone.covariance, 3)).toBe(0);
  });

  it('two thermocouples of its own are left to tell themselves', () => {
    const blank = blankTube(MODEL.tubes[1]!);
    expect(freshState(MODEL, START, lostOf(6)).tubes[1]!.covariance).toEqual(blank.covariance);
  });

  it('the string is then known far better than by half the span', () => {
    const stand = {
      massFlux_kg_m2s: 0,
      inlet_K: 733.15,
      inletSigma_K: 0,
      ambient_K: 288.15,
      dt_s: 300,
      travelSigma_m: 0,
    };
    const course = courseThrough(START, Array(4).fill(stand));
    for (const lost of [8, 7]) {
      const { all, strings } = weighed(MODEL, course, { out_of_use: lostOf(lost) });
      // Blank, the state of charge of half the store would be unknown to some 0.5 x 0.5 x 0.6.
      expect(all.soc_sigma_rms).toBeLessThan(0.05);
      expect(strings[1]!.all.soc_sigma_rms).toBeLessThan(0.1);
    }
  });
});
