import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { temperatureAt } from '../../../src/core/bed/tables.js';
import { ownReach, unseenRange, unseenReach } from '../../../src/core/track/judgeReach.js';
import { judgeWork } from '../../../src/core/track/judgeWork.js';
import { startStore } from '../../../src/core/track/storeTracker.js';
import { setTubeTemperatures } from '../../../src/core/track/tube.js';
import { mulberry } from '../../support/random.js';
import { hotStore, modelOf, stringOf } from './plants.js';
import { randomStore } from './randomStore.js';

const LENGTH_M = 4;

/** A store with one string of `sensors`, all of which read. */
function oneString(sensors: number) {
  const model = modelOf(hotStore({ strings: [stringOf('s', sensors, LENGTH_M)] }));
  const state = startStore(model);
  const work = judgeWork(model);
  for (const c of work.candidates) c.value_K = 500;
  const reach = (i: number) => unseenReach(model, state, work, work.candidates[i]!);
  return { state, work, reach };
}

describe('how far a profile may stand from the estimate where nothing else sees it', () => {
  it('is nothing where the next thermocouple stands within a tenth of the bed', () => {
    for (const sensors of [10, 14, 30]) {
      const { work, reach } = oneString(sensors);
      for (const i of work.candidates.keys()) expect(reach(i)).toBeCloseTo(0, 12);
    }
  });

  it('is a twentieth of the way beyond that', () => {
    // Three on a string stand a third of the bed apart.
    expect(oneString(3).reach(1)).toBeCloseTo((LENGTH_M / 3 - LENGTH_M / 10) / 20, 12);
    expect(oneString(5).reach(0)).toBeCloseTo((LENGTH_M / 5 - LENGTH_M / 10) / 20, 12);
    // Alone in the store: the length of the bed.
    expect(oneString(1).reach(0)).toBeCloseTo((0.9 * LENGTH_M) / 20, 12);
  });

  it('counts those alone that read and are believed', () => {
    const { state, work, reach } = oneString(5);
    const sound = reach(2);
    work.candidates[1]!.value_K = Number.NaN;
    // The other one beside it still stands as near.
    expect(reach(2)).toBeCloseTo(sound, 12);
    state.sensors[0]![3]!.verdict = 'drifting';
    expect(reach(2)).toBeCloseTo(((2 * LENGTH_M) / 5 - LENGTH_M / 10) / 20, 12);
    // A group's step is taken off its readings: they are used.
    state.sensors[0]![3]!.verdict = 'group_fault';
    expect(reach(2)).toBeCloseTo(sound, 12);
  });

  it('never shrinks by a loss, on stores drawn at random', () => {
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 1e6 }), (seed) => {
        const random = mulberry(seed);
        const model = randomStore(random);
        const state = startStore(model);
        const work = judgeWork(model);
        for (const c of work.candidates) c.value_K = random() < 0.2 ? Number.NaN : 500;
        const all = () => work.candidates.map((c) => unseenReach(model, state, work, c));
        const before = all();
        const lost = work.candidates[Math.floor(random() * work.candidates.length)]!;
        lost.value_K = Number.NaN;
        const after = all();
        const most = (0.9 * model.store.bed.length_m) / 20;
        after.forEach((r, i) => {
          expect(r).toBeGreaterThanOrEqual(before[i]!);
          expect(r).toBeLessThanOrEqual(most + 1e-12);
          expect(ownReach(r)).toBeLessThanOrEqual(r);
        });
      }),
      { numRuns: 60 },
    );
  });
});

describe('what the rock may be by within a reach', () => {
  it('is the range of the profile there, looked at point by point', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 1, max: 1e6 }),
        fc.double({ min: -0.1, max: 1.1, noNaN: true }),
        fc.double({ min: 0, max: 0.4, noNaN: true }),
        (seed, place, reach) => {
          const random = mulberry(seed);
          const model = randomStore(random);
          const state = startStore(model);
          const tube = model.tubes[0]!;
          const tubeState = state.tubes[0]!;
          const { cells } = tube.layout;
          const { length_m } = tube.tables.bed;
          const drawn = Float64Array.from({ length: cells }, () => 300 + 400 * random());
          setTubeTemperatures(tube, tubeState, drawn);
          // As the tables give it back: the search for the enthalpy leaves a rest.
          const T = Array.from(tubeState.enthalpy, (h) => temperatureAt(tube.tables, h));
          const at = (x: number): number => {
            const u = Math.min(cells - 1, Math.max(0, (x / length_m) * cells - 0.5));
            const i = Math.min(cells - 2, Math.floor(u));
            return T[i]! * (i + 1 - u) + T[i + 1]! * (u - i);
          };
          const [place_m, reach_m] = [place * length_m, reach * length_m];
          const [low, high] = unseenRange(tube, tubeState, place_m, reach_m);
          expect(low).toBeLessThanOrEqual(0);
          expect(high).toBeGreaterThanOrEqual(0);
          let coldest = Number.POSITIVE_INFINITY;
          let hottest = Number.NEGATIVE_INFINITY;
          const steps = 4000;
          for (let k = -steps; k <= steps; k++) {
            const value = at(place_m + (reach_m * k) / steps);
            coldest = Math.min(coldest, value);
            hottest = Math.max(hottest, value);
          }
          const here = at(place_m);
          // Between two points looked at the profile moves by no more than its steepest piece.
          const fine = (400 * cells * reach) / steps + 1e-6;
          expect(coldest - here).toBeGreaterThanOrEqual(low - 1e-6);
          expect(hottest - here).toBeLessThanOrEqual(high + 1e-6);
          expect(coldest - here - low).toBeLessThanOrEqual(fine);
          expect(high - (hottest - here)).toBeLessThanOrEqual(fine);
        },
      ),
      { numRuns: 60 },
    );
  });
});
