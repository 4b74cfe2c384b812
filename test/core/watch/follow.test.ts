import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  type FollowRule,
  follow,
  followed,
  healthyOf,
  heldOf,
  startFollow,
} from '../../../src/core/watch/follow.js';
import { normals } from './normals.js';

const H = 3_600_000;
const RULE: FollowRule = {
  configured: { value: 0, sigma: 0.5 },
  baseline: { floor: 0.04, enough: 0.06, least: 4 },
  from_ms: null,
  limits: [{ degraded: Math.log(0.7), back: Math.log(0.8) }],
  decision: Math.log(72_000),
};
const BOTH: FollowRule = {
  ...RULE,
  limits: [
    { degraded: 0.3, back: 0.2 },
    { degraded: -0.3, back: -0.2 },
  ],
};

/** Values about a course, one an hour; the hour of the first degraded one, and how it ended. */
function run(
  course: (hour: number) => number,
  hours: number,
  {
    rule = RULE,
    sigma = 0.12,
    seed = 1,
  }: { rule?: FollowRule; sigma?: number; seed?: number } = {},
) {
  const draw = normals(seed);
  const state = startFollow(rule.limits.length);
  let found: number | null = null;
  for (let h = 1; h <= hours; h++) {
    follow(state, { value: course(h) + sigma * draw(), sigma }, h * H, rule);
    if (found === null && followed(state, rule).state === 'degraded') found = h;
  }
  return { found, state, end: followed(state, rule) };
}

describe('a figure that is followed', () => {
  it('counts as healthy for ever where it is what it was, however far from its configuration', () => {
    for (const at of [-0.7, -0.2, 0, 0.6])
      for (let seed = 1; seed <= 10; seed++) {
        const { found, end } = run(() => at, 2400, { seed });
        expect(found).toBeNull();
        expect(end).toMatchObject({ state: 'normal', reason: null });
        expect(end.healthy.from).toBe('learned');
      }
  });

  it('is degraded within hours where it falls, whatever it had been', () => {
    for (const at of [-0.4, 0, 0.4])
      for (let seed = 1; seed <= 10; seed++) {
        const { found, end } = run((h) => (h > 30 ? at - 1 : at), 60, { seed });
        expect(found).toBeGreaterThan(30);
        expect(found).toBeLessThanOrEqual(34);
        expect(end.degraded).toBe(Math.log(0.7));
      }
  });

  it('is found where it was degraded beyond what the configuration allows from the start', () => {
    const { found, end } = run(() => Math.log(0.16), 24);
    expect(found).toBeLessThan(12);
    expect(end.healthy).toEqual({ value: 0, sigma: 0.5, from: 'configured' });
  });

  it('does not believe more of healthy than the configuration allows', () => {
    const { found, end } = run(() => -1.08, 400, { sigma: 0.05 });
    expect(found).toBeNull();
    expect(end.healthy).toEqual({ value: -1, sigma: 0, from: 'configured' });
  });

  it('does not learn a fault that comes between the first values', () => {
    const healthy = run(() => 0.2, 2, { sigma: 0.02 }).state;
    const { found, end, state } = run((h) => (h > 2 ? -2 : 0.2), 12, { sigma: 0.02 });
    expect(found).toBe(4);
    expect(state.baseline).toEqual(healthy.baseline);
    expect(end.healthy.value).toBeCloseTo(0.2, 1);
  });

  it('does not follow a slow decay', () => {
    const { found } = run((h) => -0.001 * Math.max(0, h - 48), 1200);
    // Halfway to the limit and the safe side: ln 0.84 - 0.1 after some 300 h.
    expect(found).toBeGreaterThan(150);
    expect(found).toBeLessThan(500);
  });

  it('returns where it is healthy again', () => {
    const { end } = run((h) => (h > 30 && h < 60 ? -1 : 0), 100);
    expect(end.state).toBe('normal');
  });

  it('says what it lacks for a decision', () => {
    const state = startFollow(1);
    expect(followed(state, RULE)).toMatchObject({
      state: 'undetermined',
      reason: 'not_exercised',
      score: null,
      healthy: { value: 0, sigma: 0.5, from: 'configured' },
    });
    follow(state, { value: 0.1, sigma: 0.2 }, H, RULE);
    expect(followed(state, RULE)).toMatchObject({ state: 'undetermined', reason: 'learning' });
  });

  it('decides to either side where it has two', () => {
    for (const way of [1, -1])
      expect(run((h) => (h > 30 ? way * 0.6 : 0), 60, { rule: BOTH }).end.degraded).toBe(way * 0.3);
    expect(() => follow(startFollow(1), { value: 0, sigma: 1 }, 0, BOTH)).toThrow(/2 limits for 1/);
  });

  it('learns anew after an overhaul, also where it stood degraded', () => {
    const { state } = run((h) => (h > 30 ? -1 : 0), 60);
    const rule = { ...RULE, from_ms: 61 * H };
    follow(state, { value: -1, sigma: 0.1 }, 61 * H, rule);
    expect(followed(state, rule)).toMatchObject({ state: 'undetermined', reason: 'learning' });
    expect(healthyOf(state, rule).value).toBeLessThan(-0.9);
  });

  it('goes on from a copy as from itself, and stays finite', () => {
    const value = fc.record({
      value: fc.double({ min: -5, max: 5, noNaN: true }),
      sigma: fc.double({ min: 1e-3, max: 10, noNaN: true }),
    });
    fc.assert(
      fc.property(fc.array(value, { maxLength: 40 }), fc.nat(40), (values, cut) => {
        const whole = startFollow(2);
        let copy = startFollow(2);
        values.forEach((one, n) => {
          follow(whole, one, n * H, BOTH);
          if (n === cut) copy = structuredClone(copy);
          follow(copy, one, n * H, BOTH);
        });
        expect(copy).toEqual(whole);
        const { healthy, score } = followed(whole, BOTH);
        expect(Number.isFinite(healthy.value) && Number.isFinite(healthy.sigma)).toBe(true);
        expect(score === null || (score >= 0 && score <= 1)).toBe(true);
      }),
      { seed: 7, numRuns: 200 },
    );
  });

  it('holds a state for any id, also one that every object has', () => {
    const states: Record<string, number[]> = {};
    expect(heldOf(states, 'constructor', () => [1])).toEqual([1]);
    expect(heldOf(states, 'constructor', () => [2])).toEqual([1]);
  });
});
