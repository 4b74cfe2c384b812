import { describe, expect, it } from 'vitest';
import { leakThrough, VALVE_LEAK } from '../../../../src/core/watch/indicators/valveLeak.js';
import { demo, Rig } from './rig.js';

const MOST = demo.limits.discharge.flow_max_kg_s;
const STAND = { mode: 'stand' } as const;

/** Sets what tube k of the hot store has learned of a leak [kg/s over the whole bed]. */
function learn(rig: Rig<unknown>, k: number, leak_kg_s: number, sigma_kg_s: number): void {
  const { area_m2 } = rig.model.stores[0]!.store.bed;
  const { layout } = rig.model.stores[0]!.tubes[k]!;
  const tube = rig.state.stores[0]!.tubes[k]!;
  tube.further[layout.leak - layout.cells] = leak_kg_s / area_m2;
  tube.covariance[layout.leak * (layout.size + 1)] = (sigma_kg_s / area_m2) ** 2;
}

describe('valve leak', () => {
  it('is found within a rest where the inner tubes agree on half a per cent of the flow', () => {
    const rig = new Rig(VALVE_LEAK);
    let found = Number.POSITIVE_INFINITY;
    const leak = 0.005 * 22;
    rig.run(12, (t) => {
      // What a filter learns: its sigma falls to a tenth within hours and stays.
      for (const k of [0, 1, 2]) learn(rig, k, -leak * (1 - Math.exp(-t / 2)), 0.072 / (1 + t));
      const [hot] = rig.step(STAND);
      if (hot!.state === 'degraded') found = Math.min(found, t);
      return STAND;
    });
    expect(found).toBeLessThan(12);
    const [hot, cold] = rig.step(STAND);
    expect(hot).toMatchObject({ state: 'degraded', subject: 'hot', unit: '-' });
    expect(hot!.value!).toBeCloseTo(leak / MOST, 3);
    expect(hot!.sentence).toMatch(/as while discharging/);
    expect(cold!.state).not.toBe('degraded');
  });

  it('is over only below its limit less the deadband', () => {
    const rig = new Rig(VALVE_LEAK, demo, 600);
    const leaking = (share: number, hours: number) => {
      for (const k of [0, 1, 2]) learn(rig, k, share * MOST, 0.01);
      return rig.run(hours, () => STAND)[0]!;
    };
    expect(leaking(0.005, 24)).toMatchObject({ state: 'degraded' });
    // Limit 0.25 %, deadband 0.1 %: nearer to healthy than to the limit, not than to what is back.
    expect(leaking(0.0014, 72)).toMatchObject({ state: 'degraded' });
    expect(leaking(0, 48)).toMatchObject({ state: 'normal', limit: 0.0025 });
  });

  it('takes no notice of the outermost tube, whose rock cools through the wall', () => {
    const rig = new Rig(VALVE_LEAK);
    for (const k of [0, 1]) learn(rig, k, 0.001, 0.009);
    learn(rig, 2, 0.05, 0.009);
    const { value } = leakThrough(rig.model.stores[0]!, rig.state.stores[0]!, MOST);
    expect(value).toBeCloseTo(0.001 / MOST, 8);
    const views = rig.run(36, () => STAND);
    expect(views[0]).toMatchObject({ state: 'normal', score: 0 });
  });

  it('says so where the configuration follows none, and where a rest was too short', () => {
    const none = { ...demo, estimator: { ...demo.estimator, leak_sigma_kg_s: 0 } };
    const [hot] = new Rig(VALVE_LEAK, none).run(8, () => STAND);
    expect(hot).toMatchObject({ state: 'undetermined', reason: 'not_instrumented', value: null });
    const [short] = new Rig(VALVE_LEAK).run(1, () => STAND);
    expect(short).toMatchObject({ state: 'undetermined', reason: 'not_exercised', score: null });
  });
});
