import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  type ConditionInput,
  isIdle,
  startCondition,
  stepCondition,
  stepEvidence,
  type Transition,
} from '../../../src/core/watch/condition.js';

const RULE = { limit: 10, deadband: 2, on_delay_s: 60, off_delay_s: 120 };

/** Steps through [second, value] pairs and lists [second, transition]. */
function run(
  points: readonly (readonly [number, number | null])[],
  change: Partial<ConditionInput> = {},
): [number, Transition][] {
  const state = startCondition();
  const out: [number, Transition][] = [];
  for (const [second, value] of points) {
    const transition = stepCondition(state, { ...RULE, ...change, value, time_ms: 1000 * second });
    if (transition !== null) out.push([second, transition]);
  }
  return out;
}
/** One value every 30 s from a second on. */
const hold = (from: number, to: number, value: number | null) =>
  Array.from({ length: Math.floor((to - from) / 30) }, (_, k) => [from + 30 * k, value] as const);

describe('life cycle of a condition', () => {
  it('is raised after the on-delay, and returns after the off-delay below limit less deadband', () => {
    const steps = run([...hold(0, 120, 11), ...hold(120, 400, 7)]);
    expect(steps).toEqual([
      [60, 'raised'],
      [240, 'returned'],
    ]);
  });

  it('acts at once without delays', () => {
    const none = { on_delay_s: 0, off_delay_s: 0 };
    expect(run([[0, 11]], none)).toEqual([[0, 'raised']]);
    expect(
      run(
        [
          [0, 11],
          [30, 7],
        ],
        none,
      ),
    ).toEqual([
      [0, 'raised'],
      [30, 'returned'],
    ]);
  });

  it('is not raised at the limit itself, and returns at limit less deadband itself', () => {
    expect(run(hold(0, 600, 10))).toEqual([]);
    const steps = run([...hold(0, 120, 11), ...hold(120, 600, 8)]);
    expect(steps.at(-1)).toEqual([240, 'returned']);
  });

  it('stays raised in the deadband for ever', () => {
    expect(run([...hold(0, 90, 11), ...hold(90, 9000, 8.01)])).toEqual([[60, 'raised']]);
  });

  it('starts its on-delay afresh after every dip, so that flapping raises nothing', () => {
    const flapping = hold(0, 6000, 0).map(([t], k) => [t, k % 2 === 0 ? 11 : 9] as const);
    expect(run(flapping)).toEqual([]);
  });

  it('starts its off-delay afresh after every rise, also one that stays in the deadband', () => {
    const flapping = hold(90, 6000, 0).map(([t], k) => [t, k % 3 === 2 ? 9 : 7] as const);
    expect(run([...hold(0, 90, 11), ...flapping])).toEqual([[60, 'raised']]);
  });

  it('keeps a delay running through unknown values, and neither raises nor returns on them', () => {
    expect(run([...hold(0, 30, 11), ...hold(30, 600, null)])).toEqual([]);
    expect(run([...hold(0, 30, 11), ...hold(30, 90, null), [90, 11]])).toEqual([[90, 'raised']]);
    expect(run([...hold(0, 90, 11), ...hold(90, 90000, null)])).toEqual([[60, 'raised']]);
    expect(run([[0, Number.NaN]], { on_delay_s: 0 })).toEqual([]);
  });

  it('starts a delay afresh after a gap that is longer than the given one', () => {
    const gap = { gap_s: 150 };
    expect(
      run(
        [
          [0, 11],
          [7200, 11],
          [7230, 11],
          [7260, 11],
        ],
        gap,
      ),
    ).toEqual([[7260, 'raised']]);
    // Without the gap's bound the two hours count.
    expect(
      run([
        [0, 11],
        [7200, 11],
      ]),
    ).toEqual([[7200, 'raised']]);
    // A gap as long as allowed does not interrupt.
    expect(
      run(
        [
          [0, 11],
          [150, 11],
        ],
        gap,
      ),
    ).toEqual([[150, 'raised']]);
    // A raised one stays raised over a gap.
    expect(run([...hold(0, 90, 11), [9000, 7], [9030, 7]], gap)).toEqual([[60, 'raised']]);
  });

  it('watches for values below a limit as well', () => {
    const steps = run([...hold(0, 120, 9), ...hold(120, 600, 12)], { sense: 'below' });
    expect(steps).toEqual([
      [60, 'raised'],
      [240, 'returned'],
    ]);
    expect(run([...hold(0, 90, 9), ...hold(90, 900, 11.9)], { sense: 'below' })).toHaveLength(1);
  });

  it('is idle only where nothing needs remembering', () => {
    const state = startCondition();
    expect(isIdle(state)).toBe(true);
    stepEvidence(state, 'active', { time_ms: 0, on_delay_s: 60, off_delay_s: 60 });
    expect(isIdle(state)).toBe(false);
    stepEvidence(state, 'clear', { time_ms: 30_000, on_delay_s: 60, off_delay_s: 60 });
    expect(isIdle(state)).toBe(true);
  });

  it('refuses a time that runs back and rules that make no sense', () => {
    const state = startCondition();
    stepCondition(state, { ...RULE, value: 0, time_ms: 1000 });
    const again = (change: Partial<ConditionInput>) => () =>
      stepCondition(state, { ...RULE, value: 0, time_ms: 2000, ...change });
    expect(again({ time_ms: 999 })).toThrow(/time_ms 999/);
    expect(again({ limit: Number.NaN })).toThrow(/limit.*NaN/);
    expect(again({ deadband: -1 })).toThrow(/deadband.*-1/);
    expect(again({ on_delay_s: -5 })).toThrow(/on_delay_s.*-5/);
  });

  it('alternates, and each transition has its evidence over the whole delay before it', () => {
    fc.assert(
      fc.property(
        fc.array(fc.tuple(fc.integer({ min: 1, max: 100 }), fc.integer({ min: 5, max: 13 })), {
          maxLength: 200,
        }),
        (moves) => {
          let second = 0;
          const points = moves.map(([step, value]) => {
            second += step;
            return [second, value] as const;
          });
          const steps = run(points);
          steps.forEach(([at, transition], k) => {
            expect(transition).toBe(k % 2 === 0 ? 'raised' : 'returned');
            const delay = transition === 'raised' ? RULE.on_delay_s : RULE.off_delay_s;
            // The last point at or before the start of the delay, and all since, speak for it.
            const since = points.filter(([t]) => t <= at && t > at - delay);
            for (const [, value] of since)
              expect(transition === 'raised' ? value > 10 : value <= 8).toBe(true);
          });
        },
      ),
      { seed: 21, numRuns: 500 },
    );
  });
});
