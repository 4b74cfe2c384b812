import { describe, expect, it } from 'vitest';
import { PLATEAU } from '../../../../src/core/watch/indicators/plateau.js';
import { INDICATORS_DEFAULT } from '../../../../src/core/watch/rules.js';
import { normals } from '../normals.js';
import { demo, Rig } from './rig.js';

const AMBIENT_K = 288;
const OUTLETS = { hot_K: 310, cold_K: 300 };

/** Charges with gas that enters the hot store `off_K` off from the machine's model. */
function charging(off_K: () => number) {
  const rig = new Rig(PLATEAU);
  const z = normals(7);
  const point = rig.model.machine.operate('charge', OUTLETS, AMBIENT_K);
  const run = (hours: number) =>
    rig.run(hours, () => ({
      mode: 'charge',
      flow_kg_s: 18,
      values: {
        hot_gas_bottom: OUTLETS.hot_K,
        cold_gas_top: OUTLETS.cold_K,
        hot_gas_top: point.inlets.hot_K + off_K() + 0.2 * z(),
        cold_gas_bottom: point.inlets.cold_K! + 0.2 * z(),
      },
    }));
  return { rig, run };
}

describe('plateau', () => {
  it('learns by how much the machine is off its model, and finds 12 K less', () => {
    let off = -5;
    const { run } = charging(() => off);
    const [healthy] = run(12);
    expect(healthy).toMatchObject({ state: 'normal', healthy_from: 'learned', unit: 'K' });
    expect(healthy!.value!).toBeCloseTo(0, 0);
    off = -17;
    const [cool, cold] = run(4);
    expect(cool).toMatchObject({ state: 'degraded', subject: 'hot' });
    expect(cool!.value!).toBeCloseTo(-12, 0);
    expect(cool!.sentence).toMatch(/while charging gas enters it 12\.. .* K colder/);
    expect(cold!.state).toBe('normal');
  });

  it('is healthy again only below its limit less the deadband, and anew after an overhaul', () => {
    let off = 0;
    const { rig, run } = charging(() => off);
    run(12);
    off = -15;
    expect(run(4)[0]).toMatchObject({ state: 'degraded' });
    // Less than half of the limit with its safe side, more than half of limit less deadband.
    off = -4.9;
    expect(run(8)[0]).toMatchObject({ state: 'degraded' });
    off = -9;
    rig.watching = { ...INDICATORS_DEFAULT, baseline_from_ms: rig.time_ms };
    expect(run(10)[0]).toMatchObject({ healthy_from: 'learned' });
    off = 0;
    expect(run(4)[0]!.value!).toBeGreaterThan(7);
  });

  it('leaves open a machine that has always been further off than the limit', () => {
    const [hot] = charging(() => -10.9).run(12);
    expect(hot).toMatchObject({ state: 'undetermined', reason: 'too_uncertain' });
    expect(hot!.sentence).toMatch(/-10\.\d K off the model from the start: more than the limit/);
    expect(charging(() => 0).run(12)[0]!.sentence).not.toMatch(/-0\.0/);
  });

  it('finds a machine that is 40 K off from the start', () => {
    expect(charging(() => -40).run(6)[0]!.state).toBe('degraded');
  });

  it('does not look at the first minutes of a run, nor where the gas is not measured', () => {
    expect(charging(() => -40).run(0.7)[0]).toMatchObject({
      state: 'undetermined',
      reason: 'not_exercised',
    });
    const channels = demo.channels.filter(({ role }) => role.kind !== 'gas_temperature');
    const [hot] = new Rig(PLATEAU, { ...demo, channels }).step({ mode: 'charge', flow_kg_s: 18 });
    expect(hot).toMatchObject({ state: 'undetermined', reason: 'not_instrumented' });
  });
});
