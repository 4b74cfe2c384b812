import { describe, expect, it } from 'vitest';
import { startBaseline } from '../../../../src/core/watch/baseline.js';
import { beginAnew, healthyBy, testSide } from '../../../../src/core/watch/indicators/sides.js';
import { STANDING_LOSS } from '../../../../src/core/watch/indicators/standingLoss.js';
import { INDICATORS_DEFAULT } from '../../../../src/core/watch/rules.js';
import { startSequential } from '../../../../src/core/watch/sequential.js';
import { demo, Rig } from './rig.js';

const HEALTHY = { value: 1, sigma: 0.05 };
const DECISION = 8;

/** Takes so many equal values in. */
function take(test: ReturnType<typeof startSequential>, way: 1 | -1, value: number, count: number) {
  const limit = { degraded: way * 0.4, back: way * 0.2 };
  for (let n = 0; n < count; n++) testSide(test, { value, sigma: 0.1 }, HEALTHY, limit, DECISION);
  return test.degraded;
}

describe('one side of what may degrade', () => {
  it('is tested against healthy on the safe side, and back against the limit less the deadband', () => {
    const test = startSequential();
    // Safe side 1.1, degraded 1.5, back 1.3: half-way 1.3 and 1.2.
    expect(take(test, 1, 1.29, 100)).toBe(false);
    expect(take(test, 1, 1.4, 100)).toBe(true);
    expect(take(test, 1, 1.21, 100)).toBe(true);
    expect(take(test, 1, 1.19, 100)).toBe(false);
  });

  it('is the same downwards', () => {
    const test = startSequential();
    expect(take(test, -1, 0.71, 100)).toBe(false);
    expect(take(test, -1, 0.6, 100)).toBe(true);
    expect(take(test, -1, 0.79, 100)).toBe(true);
    expect(take(test, -1, 0.81, 100)).toBe(false);
  });
});

describe('what is learned apart from the tests', () => {
  const rule = {
    configured: { value: 0, sigma: 0.1 },
    baseline: { floor: 0.01, enough: 0.02, least: 2 },
  };

  it('is weighed with the configuration, and believed up to two of its sigmas', () => {
    expect(healthyBy(startBaseline(), rule)).toMatchObject({ value: 0, sigma: 0.1 });
    const learned = { ...startBaseline(), weight: 1e4, sum: 1e4 * 0.12, count: 9 };
    expect(healthyBy(learned, rule)).toMatchObject({ from: 'learned' });
    expect(healthyBy(learned, rule).value).toBeCloseTo(0.12, 2);
    const absurd = { ...learned, sum: 1e4 * 1.1 };
    expect(healthyBy(absurd, rule)).toEqual({ value: 0.2, sigma: 0, from: 'configured' });
  });

  it('begins anew with another beginning, whatever was decided', () => {
    const learned = { ...startBaseline(), weight: 1, sum: 1, count: 3, kept: true };
    const test = { ...startSequential(), degraded: true, up: 8, count: 9 };
    expect(beginAnew([learned], [test], null)).toBe(false);
    expect(beginAnew([learned], [test], 5)).toBe(true);
    expect(learned).toEqual({ ...startBaseline(), begun_ms: 5 });
    expect(test).toEqual(startSequential());
    expect(beginAnew([learned], [test], 5)).toBe(false);
  });

  it('begins anew for standing losses although they are degraded', () => {
    const rig = new Rig(STANDING_LOSS, demo, 900);
    const { followed } = rig.own.stores[0]!;
    Object.assign(followed, { value: 2, sigma: 0.1, time_ms: rig.time_ms });
    Object.assign(followed.test, { degraded: true, count: 3 });
    expect(rig.step({ mode: 'stand' })[0]).toMatchObject({ state: 'degraded' });
    rig.watching = { ...INDICATORS_DEFAULT, baseline_from_ms: rig.time_ms };
    expect(rig.step({ mode: 'stand' })[0]).toMatchObject({ state: 'undetermined', value: null });
  });
});
