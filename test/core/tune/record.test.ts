import { describe, expect, it } from 'vitest';
import type { Scan } from '../../../src/core/scan/scan.js';
import { passEnd, startEndSteel } from '../../../src/core/tune/endSteel.js';
import { finishThinning, startThinning, thin } from '../../../src/core/tune/record.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { airUnit } from './ownModel.js';

const unit = airUnit();
const model = unitModel(unit);
const START_MS = Date.UTC(2025, 5, 1);

/** A scan at a minute of the recording: flow as asked, thermocouples at `reading_K`. */
function scan(minute: number, flow_kg_s: number, reading_K: number): Scan {
  const values = Float64Array.from(unit.channels, ({ role }) => {
    if (role.kind === 'thermocouple') return reading_K;
    if (role.kind === 'flow') {
      return role.sense === 'charge' ? Math.max(0, flow_kg_s) : Math.max(0, -flow_kg_s);
    }
    if (role.kind === 'gas_temperature') return role.end === 'charge_inlet' ? 870 : 455;
    if (role.kind === 'ambient_temperature') return 285;
    return role.kind === 'power' ? Number.NaN : 298;
  });
  return { time_ms: START_MS + minute * 60_000, values, held: new Uint8Array(values.length) };
}

function record(flows: readonly (number | null)[]) {
  const state = startThinning(model);
  flows.forEach((flow, minute) => {
    if (flow !== null) thin(state, scan(minute, flow, 500 + minute));
  });
  return finishThinning(state);
}

describe('thinning a recording', () => {
  it('keeps time, kilograms and means of the readings at their mean time', () => {
    const flows = Array.from({ length: 61 }, (_, i) => 4 + 0.01 * i);
    const { bins, from_ms, to_ms } = record(flows);
    expect(to_ms - from_ms).toBe(3600_000);
    expect(bins.map((bin) => bin.dt_s)).toEqual(Array(12).fill(300));
    const kilograms = bins.reduce((sum, bin) => sum + bin.flow_kg_s * bin.dt_s, 0);
    expect(kilograms).toBeCloseTo(
      flows.slice(1).reduce((sum, flow) => sum + flow * 60, 0),
      6,
    );
    // Readings at minutes 1 to 5, mean minute 3 of 5; they rise by a kelvin a minute.
    expect(bins[0]!.middle).toBeCloseTo(3 / 5, 12);
    expect(bins[0]!.readings[0]![0]).toBeCloseTo(503, 9);
  });

  it('ends a bin where the flow starts, turns or stops, and counts runs', () => {
    const flows = [
      ...Array(7).fill(4),
      ...Array(9).fill(0),
      ...Array(8).fill(-3),
      ...Array(4).fill(5),
    ];
    const { bins } = record(flows);
    for (const bin of bins) expect([4, 0, -3, 5]).toContain(bin.flow_kg_s);
    expect([...new Set(bins.map((bin) => bin.run))]).toHaveLength(3);
  });

  it('takes the longest stretch without a gap and tells of the others', () => {
    const gap = Array(40).fill(null);
    const { bins, stretches, leftOut_s } = record([
      ...Array(31).fill(4),
      ...gap,
      ...Array(91).fill(4),
    ]);
    expect(stretches).toBe(2);
    expect(leftOut_s).toBe(30 * 60);
    expect(bins.reduce((sum, bin) => sum + bin.dt_s, 0)).toBe(90 * 60);
  });
});

describe('the steel of an end', () => {
  it('takes from the gas what it stores', () => {
    const store = model.stores[0]!;
    const steel = startEndSteel();
    steel.charge_inlet = 500;
    let given = 0;
    const cp = store.store.bed.fluid.heatCapacity(870);
    for (let i = 0; i < 50; i++) {
      given += 4 * cp * 60 * (870 - passEnd(store, steel, 'charge', 870, Number.NaN, 4, 60));
    }
    const stored = store.store.bed.end_capacity_J_K.charge_inlet * (steel.charge_inlet - 500);
    expect(given / stored).toBeCloseTo(1, 9);
    expect(steel.charge_inlet).toBeLessThan(870);
  });
});
