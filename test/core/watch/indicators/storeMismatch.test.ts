import { describe, expect, it } from 'vitest';
import { STORE_MISMATCH } from '../../../../src/core/watch/indicators/storeMismatch.js';
import { INDICATORS_DEFAULT } from '../../../../src/core/watch/rules.js';
import { normals } from '../normals.js';
import { demo, Rig } from './rig.js';

/** Cycles after which the hot store holds `more` of its charge than the cold one, on top of the usual. */
function cycles() {
  const rig = new Rig(STORE_MISMATCH, demo, 600);
  const z = normals(10);
  const cycle = (more: number, soc_sigma = 0.004) => {
    const apart = 0.04 + more + 0.01 * z();
    const level = (soc: number) => [soc + apart, soc] as const;
    rig.run(4, () => ({ mode: 'charge', flow_kg_s: 18, soc: level(0.85), soc_sigma }));
    rig.run(1, () => ({ mode: 'stand', soc: level(0.85), soc_sigma }));
    rig.run(3, () => ({ mode: 'discharge', flow_kg_s: -22, soc: level(0.15), soc_sigma }));
    return rig.run(1, () => ({ mode: 'stand', soc: level(0.15), soc_sigma }))[0]!;
  };
  return { rig, cycle };
}

describe('store mismatch', () => {
  it('is what goes beyond the usual difference at the ends of runs', () => {
    const { cycle } = cycles();
    let view = cycle(0);
    expect(view).toMatchObject({ state: 'undetermined', reason: 'learning' });
    for (let n = 0; n < 8; n++) view = cycle(0);
    expect(view).toMatchObject({ state: 'normal', healthy_from: 'learned' });
    for (let n = 0; n < 4; n++) view = cycle(0.2);
    expect(view).toMatchObject({ state: 'degraded', subject: 'vellmoor' });
    expect(view.sentence).toMatch(/the hot store holds .* more/);
    const scale = new Rig(STORE_MISMATCH).model.fullHours() / demo.rated_hours;
    expect(view.value!).toBeCloseTo(0.2 * scale, 1);
  });

  it('comes back below the limit less the deadband, and begins anew after an overhaul', () => {
    const { rig, cycle } = cycles();
    for (let n = 0; n < 8; n++) cycle(0);
    let view = cycle(0);
    for (let n = 0; n < 5; n++) view = cycle(0.2);
    expect(view).toMatchObject({ state: 'degraded' });
    rig.watching = { ...INDICATORS_DEFAULT, baseline_from_ms: rig.time_ms };
    for (let n = 0; n < 8; n++) view = cycle(0.1);
    expect(view).toMatchObject({ state: 'normal', healthy_from: 'learned' });
    expect(Math.abs(view.value!)).toBeLessThan(0.05);
  });

  it('does not add up what the states of charge err by all the time, as if each run told it anew', () => {
    const { cycle } = cycles();
    for (let n = 0; n < 6; n++) cycle(0, 0.02);
    // 2.5 of the sigmas of the difference, 0.028, and just beyond the limit of 0.1 times 1/1.46.
    let view = cycle(0.07, 0.02);
    for (let n = 0; n < 50; n++) view = cycle(0.07, 0.02);
    expect(view).toMatchObject({ state: 'normal' });
    for (let n = 0; n < 6; n++) view = cycle(0.2, 0.02);
    expect(view).toMatchObject({ state: 'degraded' });
  });

  it('shows at the end of a run, and not by a store alone', () => {
    const { rig } = cycles();
    expect(rig.run(2, () => ({ mode: 'charge', flow_kg_s: 18 }))[0]).toMatchObject({
      state: 'undetermined',
      reason: 'not_exercised',
      value: null,
    });
  });
});
