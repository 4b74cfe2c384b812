import { describe, expect, it } from 'vitest';
import type { ChannelRole } from '../../../src/core/definitions.js';
import { createMachine } from '../../../src/core/machine/machine.js';
import {
  type Conditions,
  type ConditionsState,
  mapChannels,
  readConditions,
  startConditions,
} from '../../../src/core/track/conditions.js';
import { unitOf } from './plants.js';

const FLOW: ChannelRole = { kind: 'flow', sense: 'signed' };
const UNSIGNED: ChannelRole = { kind: 'flow', sense: 'unsigned' };
const CHARGE_FLOW: ChannelRole = { kind: 'flow', sense: 'charge' };
const DISCHARGE_FLOW: ChannelRole = { kind: 'flow', sense: 'discharge' };
const MODE: ChannelRole = { kind: 'mode' };
const POWER: ChannelRole = { kind: 'power' };
const CHARGE_VALVE: ChannelRole = { kind: 'valve', opens: 'charge' };
const DISCHARGE_VALVE: ChannelRole = { kind: 'valve', opens: 'discharge' };

const PERIOD_S = 60;
/** Gas leaving the stores of a unit that is about half full, in either direction. */
const OUTLETS = {
  charge: { hot_K: 305, cold_K: 290 },
  discharge: { hot_K: 720, cold_K: 150 },
};

/** A unit with these channels; `read` takes one scan after the other. */
function plant(roles: Record<string, ChannelRole>) {
  const unit = unitOf({ roles });
  const machine = createMachine(unit.machine);
  const map = mapChannels(unit);
  const state: ConditionsState = startConditions();
  let n = 0;
  const read = (readings: Record<string, number>): Conditions => {
    const values = new Float64Array(unit.channels.length).fill(Number.NaN);
    for (const [id, value] of Object.entries(readings)) {
      values[unit.channels.findIndex((c) => c.id === id)] = value;
    }
    n++;
    const scan = { time_ms: n * PERIOD_S * 1000, values, held: new Uint8Array(values.length) };
    return readConditions(unit, map, machine, state, scan, PERIOD_S, OUTLETS);
  };
  return { unit, machine, state, read };
}

describe('what a unit remembers of its running', () => {
  it('is how long it has stood and which way it ran, power known or not', () => {
    const { read, state } = plant({ flow: FLOW, mode: MODE });
    read({ flow: 0, mode: 0 });
    expect([state.stood_s, state.ran]).toEqual([Number.POSITIVE_INFINITY, null]);
    read({ flow: -1, mode: -1 });
    expect([state.stood_s, state.ran]).toEqual([0, 'discharge']);
    read({ flow: 0, mode: 0 });
    read({ flow: 0, mode: 0 });
    expect([state.stood_s, state.ran]).toEqual([2 * PERIOD_S, 'discharge']);
    read({ flow: 1, mode: 1 });
    expect([state.stood_s, state.ran]).toEqual([0, 'charge']);
    // A state of before these were kept counts from now on, unknown until it runs.
    delete state.stood_s;
    delete state.ran;
    read({ flow: 0, mode: 0 });
    expect(state.stood_s).toBe(Number.POSITIVE_INFINITY);
  });
});

describe('mode', () => {
  it('is that of the mode channel, whatever valves, flow and power say', () => {
    const { read } = plant({
      flow: FLOW,
      mode: MODE,
      power: POWER,
      vc: CHARGE_VALVE,
      vd: DISCHARGE_VALVE,
    });
    const against = { flow: 1, power: 80e3, vc: 1, vd: 0 };
    expect(read({ ...against, mode: -1 }).mode).toBe('discharge');
    expect(read({ ...against, mode: 0 }).mode).toBe('stand');
    expect(read({ flow: -1, power: -50e3, vc: 0, vd: 1, mode: 1 }).mode).toBe('charge');
  });

  it('is that of the valves where the mode channel is silent', () => {
    const { read } = plant({ flow: FLOW, mode: MODE, vc: CHARGE_VALVE, vd: DISCHARGE_VALVE });
    expect(read({ flow: -1, vc: 1, vd: 0 }).mode).toBe('charge');
    expect(read({ flow: 1, vc: 0, vd: 1 }).mode).toBe('discharge');
    expect(read({ flow: 0, vc: 0, vd: 0 }).mode).toBe('stand');
  });

  it('falls back to the flow where both valves are open, and counts valves from half open', () => {
    const { read } = plant({ flow: FLOW, vc: CHARGE_VALVE, vd: DISCHARGE_VALVE });
    expect(read({ flow: -1, vc: 1, vd: 1 }).mode).toBe('discharge');
    expect(read({ flow: -1, vc: 0.6, vd: 0.4 }).mode).toBe('charge');
  });

  it('is the sign of the flow where nothing tells it', () => {
    const { read } = plant({ flow: FLOW, power: POWER });
    expect(read({ flow: 1, power: -50e3 }).mode).toBe('charge');
    expect(read({ flow: -1, power: 80e3 }).mode).toBe('discharge');
  });

  it('changes to stand only in the second scan below the standing flow', () => {
    const { read, unit } = plant({ flow: FLOW });
    const below = 0.9 * unit.estimator.stand_flow_kg_s;
    read({ flow: 1 });
    const first = read({ flow: below });
    expect(first.mode).toBe('charge');
    expect(first.flow_kg_s).toBe(below);
    const second = read({ flow: below });
    expect(second.mode).toBe('stand');
    expect(second.flow_kg_s).toBe(0);
    expect(read({ flow: 1 }).mode).toBe('charge');
  });

  it('does not stand after single scans below the standing flow', () => {
    const { read } = plant({ flow: FLOW });
    for (let n = 0; n < 6; n++) {
      expect(read({ flow: n % 2 === 0 ? 1 : 0 }).mode).toBe('charge');
    }
  });
});

describe('a flow that is missing', () => {
  it('is held for two scans, then unknown and fading, and known again with the next reading', () => {
    const { read } = plant({ flow: FLOW });
    read({ flow: -1.5 });
    for (let n = 0; n < 2; n++) {
      expect(read({})).toMatchObject({ flow_kg_s: -1.5, flowKnown: true, mode: 'discharge' });
    }
    let before = 1.5;
    for (let n = 0; n < 60; n++) {
      const { flow_kg_s, flowKnown } = read({});
      expect(flowKnown).toBe(false);
      expect(Math.abs(flow_kg_s)).toBeLessThanOrEqual(before);
      before = Math.abs(flow_kg_s);
    }
    // An hour without a flow: what was last seen says little of what flows now.
    expect(before).toBeLessThan(0.75);
    expect(read({ flow: -1.2 })).toMatchObject({ flow_kg_s: -1.2, flowKnown: true });
  });

  it('is known to be none where the mode is told to stand', () => {
    const { read } = plant({ flow: FLOW, mode: MODE });
    read({ flow: 1, mode: 1 });
    for (let n = 0; n < 3; n++) read({ mode: 0 });
    expect(read({ mode: 0 })).toMatchObject({ flow_kg_s: 0, flowKnown: true, mode: 'stand' });
  });

  it('is missing as well where it is not a finite number', () => {
    const { read } = plant({ flow: FLOW });
    read({ flow: 1 });
    expect(read({ flow: Number.POSITIVE_INFINITY }).flow_kg_s).toBe(1);
  });
});

describe('a meter without a sense', () => {
  it('has its flow signed by the mode told', () => {
    const { read } = plant({ flow: UNSIGNED, mode: MODE });
    expect(read({ flow: 1, mode: 1 }).flow_kg_s).toBe(1);
    expect(read({ flow: 1, mode: -1 }).flow_kg_s).toBe(-1);
  });

  it('has its flow signed by power, which is positive while charging', () => {
    const { read } = plant({ flow: UNSIGNED, power: POWER });
    expect(read({ flow: 1, power: 80e3 })).toMatchObject({ flow_kg_s: 1, mode: 'charge' });
    expect(read({ flow: 1, power: -50e3 })).toMatchObject({ flow_kg_s: -1, mode: 'discharge' });
  });

  it('gives no known flow where neither tells the direction', () => {
    const { read } = plant({ flow: UNSIGNED, mode: MODE });
    for (let n = 0; n < 2; n++) read({ flow: 1 });
    expect(read({ flow: 1 }).flowKnown).toBe(false);
    // Nothing flows whatever the direction.
    expect(read({ flow: 0 }).flowKnown).toBe(true);
  });
});

describe('a meter for each direction', () => {
  const roles = { fc: CHARGE_FLOW, fd: DISCHARGE_FLOW };

  it('gives the difference of the two', () => {
    const { read } = plant(roles);
    expect(read({ fc: 1.25, fd: 0.25 }).flow_kg_s).toBe(1);
    expect(read({ fc: 0, fd: 1.5 }).flow_kg_s).toBe(-1.5);
  });

  it('is enough alone while it shows a flow', () => {
    const { read } = plant(roles);
    for (let n = 0; n < 4; n++) {
      expect(read({ fd: 1.5 })).toMatchObject({ flow_kg_s: -1.5, flowKnown: true });
    }
  });

  it('is unknown where the meter of the running direction falls silent and the other idles', () => {
    const { read } = plant(roles);
    read({ fc: 1, fd: 0 });
    for (let n = 0; n < 2; n++) expect(read({ fd: 0 }).flow_kg_s).toBe(1);
    expect(read({ fd: 0 })).toMatchObject({ flowKnown: false, mode: 'charge' });
  });

  it('needs only the meter of the direction that is told', () => {
    const { read } = plant({ ...roles, mode: MODE });
    for (let n = 0; n < 4; n++) {
      expect(read({ fc: 0, mode: 1 })).toMatchObject({ flowKnown: true });
      expect(read({ fd: 0, mode: 0 })).toMatchObject({ flowKnown: true });
    }
  });
});

describe('a flow from power', () => {
  it.each([
    ['charge', 90e3],
    ['discharge', -50e3],
  ] as const)('is that at which the machine takes or gives the power (%s)', (way, power) => {
    const { read, machine, unit } = plant({ power: POWER });
    const { flow_kg_s, mode, flowKnown } = read({ power });
    expect(mode).toBe(way);
    expect(flowKnown).toBe(true);
    expect(Math.sign(flow_kg_s)).toBe(Math.sign(power));
    const back = machine.powerForFlow(way, Math.abs(flow_kg_s), OUTLETS[way], unit.ambient_K);
    // An inverse of a linear relation: a few float spacings.
    expect(back / Math.abs(power)).toBeCloseTo(1, 12);
  });

  it('is none where the plant draws less than the auxiliaries of a running machine', () => {
    const { read } = plant({ power: POWER });
    for (let n = 0; n < 2; n++) read({ power: 300 });
    expect(read({ power: 300 })).toMatchObject({ flow_kg_s: 0, mode: 'stand', flowKnown: true });
  });
});

describe('a meter that is silent or refuted', () => {
  const roles = { flow: FLOW, mode: MODE, power: POWER };
  const CHARGING = { mode: 1, power: 90e3 };
  const DISCHARGING = { mode: -1, power: -50e3 };
  const byPower = (readings: { mode: number; power: number }): number => {
    const { machine, unit } = plant(roles);
    const way = readings.mode > 0 ? 'charge' : 'discharge';
    const answer = machine.flowForPower(
      way,
      Math.abs(readings.power),
      OUTLETS[way],
      unit.ambient_K,
    );
    if (!('flow_kg_s' in answer)) throw new Error(answer.reason);
    return readings.mode * answer.flow_kg_s;
  };

  it('is stood in for by power after two held scans, and that is told', () => {
    const { read } = plant(roles);
    expect(read({ ...CHARGING, flow: 1.1 }).flowStandIn).toBe(false);
    for (let n = 0; n < 2; n++) {
      expect(read(CHARGING)).toMatchObject({ flow_kg_s: 1.1, flowStandIn: false });
    }
    for (const readings of [CHARGING, DISCHARGING]) {
      expect(read(readings)).toMatchObject({
        flow_kg_s: byPower(readings),
        flowStandIn: true,
        flowKnown: true,
      });
    }
    expect(read({ ...CHARGING, flow: 1.1 })).toMatchObject({ flow_kg_s: 1.1, flowStandIn: false });
  });

  it.each([
    ['shows no flow', 0],
    ['shows the other direction', -1],
  ])('is refuted where it %s while mode and power agree', (_, flow) => {
    const { read, state } = plant(roles);
    for (let n = 0; n < 3; n++) read({ ...CHARGING, flow });
    expect(read({ ...CHARGING, flow })).toMatchObject({
      flow_kg_s: byPower(CHARGING),
      flowStandIn: true,
    });
    expect(state.disagreements).toBe(4);
  });

  it('is refuted where it shows a flow while a stand is told and no power is drawn', () => {
    const { read } = plant(roles);
    read({ ...CHARGING, flow: 1 });
    const standing = { mode: 0, power: 300, flow: 1 };
    for (let n = 0; n < 4; n++) read(standing);
    expect(read(standing)).toMatchObject({ flow_kg_s: 0, flowKnown: true, mode: 'stand' });
  });

  it('is believed where it shows a small flow while a stand is told: a valve may leak', () => {
    const { read, unit } = plant(roles);
    const leak = 2 * unit.estimator.stand_flow_kg_s;
    for (let n = 0; n < 4; n++) read({ mode: 0, power: 300, flow: leak });
    expect(read({ mode: 0, power: 300, flow: leak }).flow_kg_s).toBe(leak);
  });

  it('is believed against power alone in its direction, and refuted by it where it shows no flow', () => {
    const { read } = plant({ flow: FLOW, power: POWER });
    for (let n = 0; n < 4; n++) {
      expect(read({ flow: -1, power: 90e3 })).toMatchObject({ flow_kg_s: -1, flowStandIn: false });
    }
    for (let n = 0; n < 3; n++) read({ flow: 0, power: 90e3 });
    expect(read({ flow: 0, power: 90e3 })).toMatchObject({ mode: 'charge', flowStandIn: true });
  });

  it('leaves the last flow, in the direction told, where power is silent as well', () => {
    const { read } = plant(roles);
    read({ ...CHARGING, flow: 1.1 });
    for (let n = 0; n < 3; n++) read({ mode: 1 });
    expect(read({ mode: 1 })).toMatchObject({ flow_kg_s: 1.1, flowKnown: false });
    for (let n = 0; n < 3; n++) read({ mode: 0 });
    expect(read({ mode: -1 })).toMatchObject({ flow_kg_s: -1.1, flowKnown: false });
  });

  it('is in doubt where it shows no flow for over ten minutes of a run that is told, without power', () => {
    const { read } = plant(roles);
    for (let n = 0; n < 10; n++) expect(read({ mode: 1, flow: 0 }).flowKnown).toBe(true);
    expect(read({ mode: 1, flow: 0 })).toMatchObject({ flow_kg_s: 0, flowKnown: false });
    expect(read({ mode: 1, flow: 1 }).flowKnown).toBe(true);
  });

  it('is not stood in for by a power that no flow of this plant explains', () => {
    const { read } = plant(roles);
    read({ ...CHARGING, flow: 1.1 });
    for (let n = 0; n < 3; n++) read({ mode: 1, power: 2e6 });
    expect(read({ mode: 1, power: 2e6 }).flowKnown).toBe(false);
  });
});

describe('contradictions', () => {
  it('are counted where mode and flow have opposite signs or a told stand has flow', () => {
    const { read, state } = plant({ flow: FLOW, mode: MODE });
    read({ flow: 1, mode: 1 });
    read({ flow: -1, mode: -1 });
    read({ flow: 0, mode: 0 });
    read({ flow: 0.01, mode: -1 });
    expect(state.disagreements).toBe(0);
    read({ flow: 1, mode: -1 });
    expect(state.disagreements).toBe(1);
    read({ flow: 1, mode: 0 });
    expect(state.disagreements).toBe(2);
  });

  it('leave the metered flow in use: the mode is only a word for it', () => {
    const { read } = plant({ flow: FLOW, mode: MODE });
    expect(read({ flow: 1, mode: -1 })).toMatchObject({ flow_kg_s: 1, mode: 'discharge' });
  });

  it('are counted where a meter without a sense runs while a stand is told', () => {
    const { read, state } = plant({ flow: UNSIGNED, mode: MODE });
    read({ flow: 1, mode: 0 });
    expect(state.disagreements).toBe(1);
    read({ flow: 0, mode: 0 });
    expect(state.disagreements).toBe(1);
  });
});

describe('ambient', () => {
  it('is the measured temperature, else the configured one', () => {
    const { read, unit } = plant({ flow: FLOW, ambient: { kind: 'ambient_temperature' } });
    expect(read({ flow: 0, ambient: 270 }).ambient_K).toBe(270);
    expect(read({ flow: 0 }).ambient_K).toBe(unit.ambient_K);
  });
});
