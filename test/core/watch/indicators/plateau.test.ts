import { describe, expect, it } from 'vitest';
import { PLATEAU } from '../../../../src/core/watch/indicators/plateau.js';
import { normals } from '../normals.js';
import { demo, Rig } from './rig.js';

const AMBIENT_K = 288;
const OUTLETS = { hot_K: 310, cold_K: 300 };

/** Charges with gas that enters the hot store `off_K` off from the machine's model. */
function charging(off_K: () => number) {
  const rig = new Rig(PLATEAU);
  const z = normals(7);
  const point = rig.model.machine.operate('charge', OUTLETS, AMBIENT_K);
  return (hours: number) =>
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
}

describe('plateau', () => {
  it('learns by how much the machine is off its model, and finds 12 K less', () => {
    let off = -5;
    const run = charging(() => off);
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

  it('finds a machine that is 40 K off from the start', () => {
    expect(charging(() => -40)(6)[0]!.state).toBe('degraded');
  });

  it('does not look at the first minutes of a run, nor where the gas is not measured', () => {
    expect(charging(() => -40)(0.7)[0]).toMatchObject({
      state: 'undetermined',
      reason: 'not_exercised',
    });
    const channels = demo.channels.filter(({ role }) => role.kind !== 'gas_temperature');
    const [hot] = new Rig(PLATEAU, { ...demo, channels }).step({ mode: 'charge', flow_kg_s: 18 });
    expect(hot).toMatchObject({ state: 'undetermined', reason: 'not_instrumented' });
  });
});
