import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { freshSensor } from '../../../src/core/track/judge.js';
import { followUsual, usualFault } from '../../../src/core/track/judgeUsual.js';
import { mulberry } from '../../support/random.js';

const SCANS_H = 60;

interface Scene {
  /** Rock there [K] after so many hours, and what the sensor reads too much [K]. */
  readonly rock: (hours: number) => number;
  readonly error: (hours: number, rock: number) => number;
  readonly placeSigma_K?: number | ((hours: number) => number);
  readonly rockSigma_K?: number;
  readonly guessed?: (hours: number) => boolean;
  readonly flowing?: boolean;
  readonly seed?: number;
}

/** Judges a day; hours at which it was named and how, or null. */
function day(scene: Scene) {
  const { rock, error, placeSigma_K = 0.05, rockSigma_K = 0.3, seed = 7 } = scene;
  const memory = freshSensor();
  const random = mulberry(seed);
  for (let n = 0; n < 24 * SCANS_H; n++) {
    const hours = n / SCANS_H;
    const rock_K = rock(hours);
    const evidence = {
      time_ms: n * 60_000,
      dt_s: 60,
      value_K: rock_K + error(hours, rock_K) + 0.5 * (random() - 0.5),
      rock_K,
      rockSigma_K,
      placeSigma_K: typeof placeSigma_K === 'number' ? placeSigma_K : placeSigma_K(hours),
      offsetSigma_K: 1,
      groupSigma_K: 0.5,
      deadband_K: 0,
      movesAlike: false,
      guessed: scene.guessed?.(hours) ?? false,
      flowing: scene.flowing ?? false,
    };
    followUsual(memory, evidence);
    const fault = usualFault(memory, evidence);
    if (fault !== null) return { hours, ...fault };
  }
  return null;
}

const STEADY = (): number => 298;

describe('a sound sensor', () => {
  it('is never named for an offset, gain and daily swing of its class, front and all', () => {
    fc.assert(
      fc.property(
        fc.double({ min: -2.5, max: 2.5, noNaN: true }),
        fc.double({ min: -0.0075, max: 0.0075, noNaN: true }),
        fc.double({ min: 0, max: 1, noNaN: true }),
        fc.double({ min: 0, max: 24, noNaN: true }),
        fc.integer({ min: 1, max: 1e6 }),
        (offset, gain, swing, phase, seed) => {
          const found = day({
            // A cold front of 154 K comes at 5 h and goes at 15 h.
            rock: (h) => 298 - 77 * (Math.tanh((h - 5) / 0.7) - Math.tanh((h - 15) / 0.7)),
            error: (h, T) =>
              offset + gain * (T - 273.15) + swing * Math.sin((2 * Math.PI * (h + phase)) / 24),
            seed,
          });
          expect(found).toBeNull();
        },
      ),
      { seed: 3, numRuns: 60 },
    );
  });

  it('is not judged in the front, where an error of its place reads like a drift', () => {
    const error = (h: number): number => (h < 3 ? 0 : Math.min(4, h - 3));
    expect(day({ rock: STEADY, error, placeSigma_K: 3 })).toBeNull();
    expect(day({ rock: STEADY, error })?.verdict).toBe('drifting');
  });

  it('is not judged while the bed tells no more of it than its class does', () => {
    const error = (h: number): number => Math.min(3, h / 2);
    expect(day({ rock: STEADY, error, rockSigma_K: 0.8 })).toBeNull();
  });
});

describe('a profile that misleads', () => {
  it('teaches nothing while it is a guess: what was off by 6 K then has not drifted', () => {
    const error = (h: number): number => (h < 3 ? -6 : 0);
    expect(day({ rock: STEADY, error, guessed: (h) => h < 3 })).toBeNull();
    expect(day({ rock: STEADY, error })?.verdict).toMatch(/drifting|offset/);
  });

  it('is no evidence in a front that passes, however far off; where it stands, it is', () => {
    const scene = {
      rock: STEADY,
      error: (h: number) => (h < 2 || h > 6 ? 0 : 15),
      placeSigma_K: (h: number) => (h < 2 || h > 6 ? 0.05 : 3),
    };
    expect(day({ ...scene, flowing: true })).toBeNull();
    expect(day({ ...scene, flowing: false })?.hours).toBeLessThan(3);
  });

  it('leaves what was learned near a front as uncertain as its place made it', () => {
    // Learned at half a class from the front, 2.5 K off: less than 4 sigma of both errors.
    const error = (h: number): number => (h < 4 ? 2.5 : 0);
    const near = (h: number): number => (h < 4 ? 0.45 : 0.02);
    expect(day({ rock: STEADY, error, placeSigma_K: near, flowing: true })).toBeNull();
  });
});

describe('a drift of 1 to 3 K/h', () => {
  it('is named before it has come to 6 K', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 1, max: 3, noNaN: true }),
        fc.constantFrom(-1, 1),
        fc.double({ min: -2, max: 2, noNaN: true }),
        fc.double({ min: 2, max: 8, noNaN: true }),
        (rate, side, offset, from) => {
          const drift = (h: number): number => side * rate * Math.max(0, h - from);
          const found = day({ rock: STEADY, error: (h) => offset + drift(h) });
          expect(found?.verdict).toMatch(/drifting|offset/);
          expect(Math.abs(drift(found?.hours ?? 24))).toBeLessThan(6);
          expect(found?.evidence).toMatch(/[-\d.]+ K/);
        },
      ),
      { seed: 4, numRuns: 60 },
    );
  });
});

describe('an offset beyond the class', () => {
  it('is named though it was there from the start', () => {
    expect(day({ rock: STEADY, error: () => 9 })?.verdict).toBe('offset');
    expect(day({ rock: STEADY, error: () => 2.5 })).toBeNull();
  });
});
