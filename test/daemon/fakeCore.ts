import type { UnitDefinition } from '../../src/core/definitions.js';
import type { Estimate } from '../../src/core/estimate.js';
import type { Scan } from '../../src/core/scan/scan.js';
import type { UnitSnapshot, UnitState } from '../../src/core/unit.js';
import type { WatchEvent } from '../../src/core/watch/event.js';
import type { Core } from '../../src/daemon/core.js';

/** All that this core remembers: a number that every value of every scan has gone into. */
interface Memory {
  time_ms: number | null;
  mix: number;
  scans: number;
  stale: boolean;
}

const memory = (state: UnitState) => state as unknown as Memory;

function take(state: Memory, scan: Scan): void {
  if (state.time_ms !== null && scan.time_ms <= state.time_ms) {
    throw new RangeError(`scan at ${scan.time_ms} must be later than ${state.time_ms}`);
  }
  state.time_ms = scan.time_ms;
  state.scans++;
  // Not associative, so that any change of order or value shows in the last bits.
  scan.values.forEach((value, i) => {
    if (!Number.isNaN(value))
      state.mix = Math.sin(state.mix * 1.7 + value * (i + 1)) + scan.held[i]!;
  });
}

function estimateOf(unit: UnitDefinition, state: Memory, time_ms: number): Estimate {
  return {
    time: new Date(time_ms).toISOString(),
    unit: unit.id,
    revision: 0,
    mode: 'stand',
    quality: state.stale ? 'stale' : 'good',
    state_of_charge: state.mix,
    stores: {},
  };
}

function staleEvent(unit: UnitDefinition, time_ms: number, isRaised: boolean): WatchEvent {
  return {
    id: `${unit.id}/data_stale/unit`,
    unit: unit.id,
    kind: 'data_stale',
    class: 'alert',
    priority: 'high',
    subject: 'unit',
    transition: isRaised ? 'raised' : 'returned',
    time: new Date(time_ms).toISOString(),
    value: null,
    limit: null,
    message: isRaised ? 'no reading in a scan' : 'readings again',
  };
}

const answer = (power_W: number, mix: number) => ({
  power_MW: power_W / 1e6,
  hours: { p90: mix, p50: mix + 1, p10: mix + 2 },
  energy_MWh_el: { p90: mix, p50: mix + 1, p10: mix + 2 },
  ends_by: 'empty' as const,
});

/** A core in a few lines, with which the daemon can be tested to the last bit and fast. */
export const fakeCore: Core = {
  startUnit: () => ({ time_ms: null, mix: 0.5, scans: 0, stale: false }) as unknown as UnitState,
  advance(unit, state, scan, ask) {
    const own = memory(state);
    take(own, scan);
    const isEmpty = scan.values.every((value) => Number.isNaN(value));
    const events = isEmpty === own.stale ? [] : [staleEvent(unit, scan.time_ms, isEmpty)];
    own.stale = isEmpty;
    const estimate = estimateOf(unit, own, scan.time_ms);
    if (ask.hours_at_W.length > 0) {
      estimate.dispatch = ask.hours_at_W.map((power_W) => answer(power_W, own.mix));
    }
    return { estimate, profile: { time: estimate.time, unit: unit.id, stores: {} }, events };
  },
  saveUnit: (state) => ({ version: 1, state: structuredClone(state) }) as UnitSnapshot,
  restoreUnit: (_unit, snapshot) => structuredClone(snapshot.state),
  carryUnit: () => {
    throw new RangeError('this core carries nothing over');
  },
  answerPlan: () => {
    throw new RangeError('this core has no plan');
  },
  hoursAt: (_unit, state, powers_W) =>
    powers_W.map((power_W) => answer(power_W, memory(state).mix)),
  // biome-ignore lint/correctness/useYield: an answer that takes no time
  *unitWorth(unit, state) {
    const over = {
      kind: 'now',
      mode: 'stand',
      hours: state === null ? 0 : memory(state).mix,
    } as const;
    return { unit: unit.id, over, full_hours: 6, rejected: [], stores: [] };
  },
  hoursDue: (unit, last_ms, now_ms) =>
    last_ms === null ||
    Math.floor(now_ms / unit.hours_every_s / 1000) !==
      Math.floor(last_ms / unit.hours_every_s / 1000),
};
