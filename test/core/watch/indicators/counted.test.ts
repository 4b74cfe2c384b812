import { describe, expect, it } from 'vitest';
import type { FrontViewEstimate, RejectedSensor } from '../../../../src/core/estimate.js';
import { AGREEMENT } from '../../../../src/core/watch/indicators/agreement.js';
import { SENSOR_HEALTH } from '../../../../src/core/watch/indicators/sensorHealth.js';
import { normals } from '../normals.js';
import { type Moment, unsound, watchScript } from './filter.js';

const viewOf = (id: string, disagreement: number | null): FrontViewEstimate => ({
  ...{ id, position_m: 1, position_sigma_m: 0.02, width_m: 0.3, width_sigma_m: 0.02 },
  ...{ seen: disagreement !== null, disagreement },
});
const RUN_H = 4;
/**
 * A front that goes 0.8 m an hour, the pitch of the thermocouples, the other way every four hours, and
 * disagrees as listed by the hour.
 */
const course =
  (sigmas: readonly (number | null)[], id = 'a') =>
  (hour: number): Moment => ({
    mode: Math.floor(hour / RUN_H) % 2 === 0 ? 'charge' : 'discharge',
    travelled_m: 0.8001 * hour,
    estimate: { hot: { front_views: [viewOf(id, sigmas[Math.floor(hour)]!)] } },
  });
const runs = (...sigmas: readonly number[]) =>
  sigmas.flatMap((sigma) => Array<number>(RUN_H).fill(sigma));

describe('front view against the tubes', () => {
  it('is degraded where it has kept on beyond the limit over runs, and healthy again likewise', () => {
    const list = runs(...Array(10).fill(1.5), ...Array(10).fill(4.5), ...Array(10).fill(0.5));
    const states: string[] = [];
    const { found, of, views } = watchScript(AGREEMENT, 119.9, course(list), {
      each: (_, [first]) => states.push(first!.state),
    });
    // ln(3000 days over 6 h) = 9.4, and 2 (4.5 - 3) a run: with the fourth run after 40 h.
    expect(found['hot/a']).toBeGreaterThan(55);
    expect(found['hot/a']).toBeLessThan(57);
    expect(states.at(-1)).toBe('normal');
    expect(new Set(states.slice(0, 400))).toEqual(new Set(['normal']));
    expect(of('hot/b')).toMatchObject({ state: 'undetermined', reason: 'not_exercised' });
    expect(views.flatMap(unsound)).toEqual([]);
  });

  it('does not mind a front that is off for a part of a run, nor all along a single one', () => {
    const partly = Array.from({ length: 40 }, () => [0, 6, 0, 0]).flat();
    expect(watchScript(AGREEMENT, 159.9, course(partly), { dt_s: 600 }).found).toEqual({});
    expect(watchScript(AGREEMENT, 23.9, course(runs(0, 0, 8, 0, 0, 0))).found).toEqual({});
  });

  it('is never degraded where healthy runs scatter about what healthy ones come to', () => {
    const draw = normals(5);
    const list = runs(...Array.from({ length: 300 }, () => 1 + draw()));
    expect(watchScript(AGREEMENT, 1199.9, course(list), { dt_s: 1200 }).found).toEqual({});
  });

  it('takes nothing while it stands, or where the string sees no front', () => {
    const still = () => ({ ...course([9])(0), travelled_m: 3 });
    expect(watchScript(AGREEMENT, 20, still).found).toEqual({});
    const unseen = course(Array(20).fill(null));
    const { of } = watchScript(AGREEMENT, 19.9, unseen);
    expect(of('hot/a')).toMatchObject({ reason: 'not_exercised', value: null });
  });

  it('says to which side, by the sign of limit and value', () => {
    const { of } = watchScript(AGREEMENT, 23.9, course(runs(-5, -5, -5, -5, -5, -5), 'b'));
    expect(of('hot/b')).toMatchObject({ value: -5, limit: -3, state: 'degraded' });
    expect(of('hot/b').sentence).toMatch(/5\.0 sigmas nearer to the charge inlet/);
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
