import { describe, expect, it } from 'vitest';
import { alignWatch } from '../../../src/core/watch/align.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import { startWatch, stepWatch, type WatchState } from '../../../src/core/watch/watch.js';
import { estimateOf, unitOf } from './units.js';

/** Scans of 30 s in which an outlet is 5 K above its limit, or far from it. */
function run(state: WatchState, from: number, scans: number, isNear: boolean): WatchEvent[] {
  return Array.from({ length: scans }, (_, k) => {
    const time_ms = 30_000 * (from + k);
    const estimate = estimateOf(time_ms, { outlet_K: isNear ? 678.15 : 760 });
    return stepWatch(unitOf(), state, { time_ms, mode: 'discharge', estimate, readingsSeen: 9 });
  }).flat();
}
const KEY = 'outlet_near_limit/hot';

describe('a watch put back to an older state', () => {
  it('gives back what was raised since, once its condition is over', () => {
    const state = startWatch();
    const older = structuredClone(state);
    expect(run(state, 0, 5, true).map((e) => e.transition)).toEqual(['raised']);
    expect(run(structuredClone(older), 5, 9, false)).toEqual([]);
    alignWatch(older, new Set([KEY]));
    expect(run(older, 5, 9, false).map((e) => e.transition)).toEqual(['returned']);
  });

  it('does not raise again what stands', () => {
    const older = startWatch();
    alignWatch(older, new Set([KEY]));
    expect(run(older, 5, 9, true)).toEqual([]);
  });

  it('raises anew what had returned since', () => {
    const older = startWatch();
    run(older, 0, 5, true);
    expect(run(structuredClone(older), 5, 9, true)).toEqual([]);
    alignWatch(older, new Set());
    expect(run(older, 5, 9, true).map((e) => e.transition)).toEqual(['raised']);
  });

  it('keeps delays that run', () => {
    const older = startWatch();
    run(older, 0, 2, true);
    const before = structuredClone(older);
    alignWatch(older, new Set());
    expect(older).toEqual(before);
  });
});
