import { describe, expect, it } from 'vitest';
import { pressureDrop } from '../../../../src/core/bed/pressureDrop.js';
import { PRESSURE_DROP } from '../../../../src/core/watch/indicators/pressureDrop.js';
import { INDICATORS_DEFAULT } from '../../../../src/core/watch/rules.js';
import { normals } from '../normals.js';
import { demo, Rig } from './rig.js';

/** Runs with a drop of so many times Ergun's in the cold store, whose rock is at `rock_K` throughout. */
function rigAt(seed: number) {
  const rig = new Rig(PRESSURE_DROP);
  const z = normals(seed);
  const { bed } = demo.stores[1]!;
  const run = (hours: number, rock_K: number, factor: number, flow = 18, pressure = 1) => {
    rig.fill(1, () => rock_K);
    return rig.run(hours, () => {
      const law = pressureDrop(bed, flow / bed.area_m2, [rock_K]) / pressure;
      const values = {
        cold_drop: law * factor * (1 + 0.01 * z()),
        cold_pressure: bed.pressure_Pa * pressure * (1 + 0.001 * z()),
      };
      return { mode: 'charge', flow_kg_s: flow, values };
    })[1]!;
  };
  return { rig, run };
}

describe('pressure drop', () => {
  it('learns what is healthy, 12 % above the law, and finds 1.2 times that within three hours', () => {
    const { run } = rigAt(1);
    expect(run(3, 200, 1.12)).toMatchObject({ state: 'undetermined', reason: 'learning' });
    const healthy = run(9, 200, 1.12);
    expect(healthy).toMatchObject({ state: 'normal', healthy_from: 'learned', score: 0 });
    expect(healthy.value!).toBeCloseTo(1, 2);
    const dusty = run(3, 200, 1.2 * 1.12);
    expect(dusty).toMatchObject({ state: 'degraded', score: 1 });
    expect(dusty.value!).toBeCloseTo(1.2, 1);
  });

  it('is the same at another flow, temperature and pressure', () => {
    const { run } = rigAt(2);
    run(10, 200, 1);
    expect(run(4, 290, 1, 11).value!).toBeCloseTo(1, 1);
    const thin = run(4, 200, 1, 18, 0.9);
    expect(thin).toMatchObject({ state: 'normal', score: 0 });
    expect(thin.value!).toBeCloseTo(1, 1);
  });

  it('tells frost, which is gone when no rock is below freezing, from dust', () => {
    const frost = rigAt(3);
    frost.run(10, 200, 1);
    expect(frost.run(4, 200, 1.5).only_while_cold).toBeNull();
    const gone = frost.run(2, 290, 1);
    expect(gone).toMatchObject({ state: 'degraded', only_while_cold: true });
    expect(gone.sentence).toMatch(/Only while rock is below freezing/);
    const dust = rigAt(4);
    dust.run(10, 200, 1);
    dust.run(4, 200, 1.5);
    expect(dust.run(2, 290, 1.5)).toMatchObject({ state: 'degraded', only_while_cold: false });
  });

  it('finds what was there from the start where it is gross, and says where nothing is measured', () => {
    expect(rigAt(5).run(4, 200, 2.2)).toMatchObject({ state: 'degraded' });
    const channels = demo.channels.filter(({ role }) => role.kind !== 'pressure_drop');
    const [hot] = new Rig(PRESSURE_DROP, { ...demo, channels }).step({ mode: 'stand' });
    expect(hot).toMatchObject({ state: 'undetermined', reason: 'not_instrumented', healthy: null });
  });

  it('is healthy again only below its limit less the deadband', () => {
    const { run } = rigAt(7);
    run(10, 200, 1);
    expect(run(3, 200, 1.3)).toMatchObject({ state: 'degraded' });
    // 1.09 is nearer to healthy than to the limit of 1.15, but not than to 1.10.
    expect(run(12, 200, 1.09)).toMatchObject({ state: 'degraded' });
    expect(run(6, 200, 1)).toMatchObject({ state: 'normal' });
  });

  it('begins anew after an overhaul, although it stood degraded', () => {
    const { rig, run } = rigAt(8);
    run(10, 200, 1);
    expect(run(4, 200, 1.4)).toMatchObject({ state: 'degraded' });
    rig.watching = { ...INDICATORS_DEFAULT, baseline_from_ms: rig.time_ms };
    expect(run(9, 200, 1.4)).toMatchObject({ state: 'normal', healthy_from: 'learned' });
    expect(run(4, 200, 1.7)).toMatchObject({ state: 'degraded' });
  });

  it('counts what it leaves out', () => {
    const { run } = rigAt(9);
    expect(run(1, 200, 1e12).sentence).toMatch(/Left out .* 6 with a drop that no bed has/);
    expect(run(2, 200, 1)).toMatchObject({ score: 0 });
  });

  it('never decides in 200 healthy hours', () => {
    const { run } = rigAt(6);
    for (let n = 0; n < 20; n++) {
      const view = run(10, n % 2 === 0 ? 190 : 285, 0.93, n % 3 === 0 ? 12 : 20);
      expect(view.state).not.toBe('degraded');
      expect(view.score!).toBeLessThan(0.5);
    }
  });
});
