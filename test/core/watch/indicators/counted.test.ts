import { describe, expect, it } from 'vitest';
import type { FrontViewEstimate, RejectedSensor } from '../../../../src/core/estimate.js';
import { AGREEMENT } from '../../../../src/core/watch/indicators/agreement.js';
import { SENSOR_HEALTH } from '../../../../src/core/watch/indicators/sensorHealth.js';
import { type Moment, unsound, watchScript } from './filter.js';

const viewOf = (id: string, disagreement: number | null): FrontViewEstimate => ({
  ...{ id, position_m: 1, position_sigma_m: 0.02, width_m: 0.3, width_sigma_m: 0.02 },
  ...{ seen: disagreement !== null, disagreement },
});
const hot = (front_views: FrontViewEstimate[]): Moment => ({ estimate: { hot: { front_views } } });

describe('front view against the tubes', () => {
  it('is degraded beyond the limit and stays so until the deadband is left', () => {
    const states: string[] = [];
    const sigmas = [0, 2.5, 3.5, 2.5, 1.9, null, 3.1];
    const { of, views } = watchScript(
      AGREEMENT,
      6.9,
      (h) => hot([viewOf('a', sigmas[Math.floor(h)]!)]),
      {
        dt_s: 3600,
        each: (_, [first]) => states.push(first!.state),
      },
    );
    expect(states).toEqual([
      ...['normal', 'normal', 'degraded', 'degraded', 'normal', 'normal', 'degraded'],
    ]);
    expect(of('hot/a')).toMatchObject({ value: 3.1, limit: 3, score: 1, unit: 'sigma' });
    expect(of('hot/b')).toMatchObject({ state: 'undetermined', reason: 'not_exercised' });
    expect(views.flatMap(unsound)).toEqual([]);
  });

  it('says to which side, by the sign of limit and value', () => {
    const { of } = watchScript(AGREEMENT, 1, () => hot([viewOf('b', -4)]));
    expect(of('hot/b')).toMatchObject({ value: -4, limit: -3 });
    expect(of('hot/b').sentence).toMatch(/4\.0 sigmas nearer to the charge inlet/);
  });
});

describe('health of the thermocouples', () => {
  const rejected = (count: number): RejectedSensor[] =>
    Array.from({ length: count }, (_, n) => ({
      ...{ id: `hot_a_${n + 1}`, verdict: 'open', since: '2026-01-01T00:00:00.000Z', evidence: '' },
    }));

  it('counts what is not believed, with a deadband', () => {
    const counts = [0, 3, 4, 3, 2];
    const states: string[] = [];
    const { of, views } = watchScript(
      SENSOR_HEALTH,
      4.9,
      (h) => ({
        estimate: { hot: { sensors: { used: 15, rejected: rejected(counts[Math.floor(h)]!) } } },
      }),
      { dt_s: 3600, each: (_, [first]) => states.push(first!.state) },
    );
    expect(states).toEqual(['normal', 'normal', 'degraded', 'degraded', 'normal']);
    expect(of('hot')).toMatchObject({ value: 2 / 15, sigma: 0, healthy: 0 });
    expect(of('hot').sentence).toMatch(/2 of 15 thermocouples/);
    expect(views.flatMap(unsound)).toEqual([]);
  });

  it('says nothing of a store that has not been read', () => {
    const { of } = watchScript(SENSOR_HEALTH, 1, () => ({
      estimate: { hot: { fronts_reason: 'not_started' } },
    }));
    expect(of('hot')).toMatchObject({
      state: 'undetermined',
      reason: 'not_exercised',
      value: null,
    });
    expect(unsound(of('hot'))).toEqual([]);
  });
});
