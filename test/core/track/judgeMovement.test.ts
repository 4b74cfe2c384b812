import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  celsiusFromMillivolt,
  millivoltFromCelsius,
  THERMOCOUPLE_TYPES,
} from '../../../src/core/thermocouple/its90.js';
import { freshSensor } from '../../../src/core/track/judge.js';
import {
  followMovement,
  isMovementKnown,
  isNoOffset,
  mirrored,
  misread,
  misreadTypes,
  movesAsRock,
} from '../../../src/core/track/judgeMovement.js';

const SIGMA = 0.5;

/** A sensor whose rock goes through `path`, one scan a minute, and what it makes of it. */
function follow(path: readonly number[], read: (rock: number, n: number) => number) {
  const memory = freshSensor();
  path.forEach((predicted_K, n) => {
    const value_K = read(predicted_K, n);
    followMovement(memory, {
      time_ms: n * 60_000,
      dt_s: 60,
      value_K,
      predicted_K,
      sigma_K: SIGMA,
    });
    memory.expected_K = predicted_K;
  });
  return memory;
}

/** The foot of a front arrives: from a plateau by `by` K within the hour. */
const foot = (from: number, by: number): number[] =>
  Array.from({ length: 61 }, (_, n) => from + by * (n / 60) ** 2);

describe('movement by the model alone', () => {
  it('is no evidence for three hours after gas came in that nothing measured', () => {
    const memory = freshSensor();
    expect(isMovementKnown(memory, 0)).toBe(true);
    const scan = { dt_s: 60, value_K: 300, predicted_K: 300, sigma_K: SIGMA };
    const hour = 3600_000;
    for (let n = 0; n <= 10 * 60; n++) {
      // The inlet is silent within the third hour.
      const inletAssumed = n >= 120 && n < 180;
      followMovement(memory, { ...scan, time_ms: n * 60_000, inletAssumed });
      memory.expected_K = 300;
      const last = Math.min(n, 179) * 60_000;
      const expected = n < 120 || n * 60_000 - last >= 3 * hour;
      expect(isMovementKnown(memory, n * 60_000), `minute ${n}`).toBe(expected);
    }
  });
});

describe('reversed wires', () => {
  it('are told by a movement against the rock, whatever the temperature of the cold junction', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 280, max: 316, noNaN: true }),
        fc.double({ min: -20, max: 20, noNaN: true }),
        fc.constantFrom(-1, 1),
        (junction, from, side) => {
          const path = foot(298 + from, 6 * side);
          const read = (rock: number): number => 2 * junction - rock;
          const memory = follow(path, read);
          const rock = path.at(-1) as number;
          expect(mirrored(memory, read(rock), rock, 0, SIGMA, SIGMA, true)).toBe('yes');
        },
      ),
      { seed: 1, numRuns: 100 },
    );
  });

  it('are not told by a difference alone that grew as a drift does', () => {
    const memory = follow([250, 250], (rock) => rock);
    const mirrorOf = (grew: boolean) => mirrored(memory, 346, 250, 0, SIGMA, SIGMA, true, grew);
    expect(mirrorOf(false)).toBe('yes');
    expect(mirrorOf(true)).toBe('no');
  });

  it('are told at once far from the cold junction, by the voltage of any type', () => {
    for (const type of THERMOCOUPLE_TYPES) {
      for (const rock of [-120, -60, 90, 200]) {
        for (const junction of [15, 25, 35]) {
          const at = (t: number): number => millivoltFromCelsius(type, t);
          const read = celsiusFromMillivolt(type, -(at(rock) - at(junction)), junction);
          if (typeof read !== 'number') continue;
          const judged = mirrored(
            freshSensor(),
            read + 273.15,
            rock + 273.15,
            0,
            SIGMA,
            SIGMA,
            true,
          );
          expect(judged, `${type} ${rock} ${junction}`).toBe('yes');
        }
      }
    }
  });

  it('are no sound sensor in a front, nor one with an offset, nor one that drifts', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -15, max: 15, noNaN: true }),
        fc.double({ min: -3, max: 3, noNaN: true }),
        fc.double({ min: 4, max: 150, noNaN: true }),
        fc.constantFrom(-1, 1),
        (offset, drift, by, side) => {
          const path = foot(298, by * side);
          const read = (rock: number, n: number): number => rock + offset + (drift * n) / 60;
          const memory = follow(path, read);
          const rock = path.at(-1) as number;
          expect(mirrored(memory, read(rock, 60), rock, 0, SIGMA, SIGMA, true)).toBe('no');
        },
      ),
      { seed: 2, numRuns: 100 },
    );
  });

  it('are no sound sensor where the rock is hardly known, nor where the reading moves by its noise', () => {
    const path = foot(298, 6);
    const memory = follow(path, (rock) => 2 * 305 - rock);
    const rock = path.at(-1) as number;
    const judged = (sigma: number, noise: number) =>
      mirrored(memory, 2 * 305 - rock, rock, 0, sigma, noise, true);
    expect(judged(1, 0.5)).toBe('yes');
    expect(judged(6, 0.5)).toBe('no');
    expect(judged(1, 2)).toBe('no');
  });

  it('are told alike where most scans bring no reading', () => {
    const path = foot(298, 6);
    const every = follow(path, (rock) => rock);
    const few = follow(path, (rock, n) => (n % 5 === 0 ? rock : Number.NaN));
    // What moved between two readings fades only from the second one on: by five minutes of three hours.
    const most = (300 / (3 * 3600)) * 6;
    expect(Math.abs(few.sinceRead_K - every.sinceRead_K)).toBeLessThan(most);
    expect(Math.abs(few.sinceModelled_K - every.sinceModelled_K)).toBeLessThan(most);
    expect(few.sinceModelled_K).toBeGreaterThan(4);
  });

  it('are no offset of 15 K that came with a leap: what moved before counts no more', () => {
    const path = [...foot(290, 8), ...foot(298, 5)];
    const memory = follow(path, (rock, n) => (n > 60 ? rock - 15 : rock));
    const rock = path.at(-1) as number;
    expect(mirrored(memory, rock - 15, rock, 0, SIGMA, SIGMA, true)).toBe('no');
  });
});

describe('movement', () => {
  it('as the rock is that of a sound sensor, and not that of a frozen one', () => {
    const path = foot(300, 30);
    expect(movesAsRock(follow(path, (rock) => rock + 3))).toBe(true);
    expect(movesAsRock(follow(path, () => 300))).toBe(false);
    // Where nothing moves, nothing is shown.
    expect(movesAsRock(follow(foot(300, 1), (rock) => rock))).toBe(false);
  });

  it('starts anew where a change of the flow moves the junction by its gas', () => {
    const memory = follow(foot(300, 30), (rock) => rock);
    memory.unsettled_ms = 1e9;
    followMovement(memory, {
      time_ms: 0,
      dt_s: 60,
      value_K: 350,
      predicted_K: 300,
      sigma_K: SIGMA,
    });
    expect(memory).toMatchObject({ read_K: 0, modelled_K: 0, sinceRead_K: 0 });
  });
});

describe('another type`s table', () => {
  it('read by its own table is the temperature itself', () => {
    for (const type of THERMOCOUPLE_TYPES) {
      for (const t of [-150, 0, 100, 350]) expect(misread(type, type, t, 25)).toBeCloseTo(t, 6);
    }
  });

  it('is found with a fit of 8 %, where it makes 15 K or more', () => {
    for (const wire of THERMOCOUPLE_TYPES) {
      for (const table of THERMOCOUPLE_TYPES) {
        for (const t of [-120, 150, 380]) {
          const read = misread(wire, table, t, 25);
          if (wire === table || !(Math.abs(read - t) > 20)) continue;
          const found = misreadTypes(read + 273.15, t + 273.15, SIGMA);
          // Some pairs are alike there: the one found must make the same of it.
          expect(found, `${wire} by ${table} at ${t}`).not.toBeNull();
          const [w, b] = found ?? ['K', 'K'];
          expect(Math.abs(misread(w, b, t, 25) - read)).toBeLessThan(0.08 * Math.abs(read - t));
        }
      }
    }
  });

  it('is no explanation of a few kelvin, nor where the estimate is too uncertain', () => {
    expect(misreadTypes(612, 600, SIGMA)).toBeNull();
    expect(misreadTypes(640, 600, 10)).toBeNull();
  });

  it('takes more than an offset that stays', () => {
    const memory = { ...freshSensor(), firstRead_K: 640, firstRock_K: 600 };
    expect(isNoOffset(memory, 690, 650, SIGMA)).toBe(false);
    expect(isNoOffset(memory, 697, 650, SIGMA)).toBe(true);
  });
});
