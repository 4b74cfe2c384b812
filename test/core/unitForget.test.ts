import { describe, expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.js';
import type { UnitDefinition } from '../../src/core/definitions.js';
import { advance, startUnit } from '../../src/core/unit.js';

const unit = loadSite('config/demo.yaml').units[0] as UnitDefinition;
const DAY_MS = 24 * 3600 * 1000;

/** Half-charged stores, sharp fronts; the hot outlet pipe at a given temperature. */
function scanAt(time_ms: number, mode: number, pipe_K: number) {
  const values = Float64Array.from(unit.channels, (channel) => {
    const { role } = channel;
    if (role.kind === 'mode') return mode;
    if (role.kind === 'flow') return 20 * mode;
    if (role.kind === 'power') return 1.8e6 * mode;
    if (role.kind === 'ambient_temperature') return 283;
    if (role.kind === 'gas_temperature') {
      if (role.store === 'hot') return role.end === 'charge_inlet' ? pipe_K : 298;
      return role.end === 'charge_inlet' ? 145 : 298;
    }
    if (role.kind !== 'thermocouple') return Number.NaN;
    const store = unit.stores.find((s) => s.id === role.store);
    const all = store?.strings.flatMap((s) => s.thermocouples) ?? [];
    const x = all.find((t) => t.id === channel.id)?.position_m ?? 0;
    const charged = x < 5;
    if (role.store === 'hot') return charged ? 733 : 298;
    return charged ? 144 : 298;
  });
  return { time_ms, values, held: new Uint8Array(values.length) };
}

const HOURS = { hours_at_W: [1.8e6], profile: false };

describe('a unit that heard nothing for long', () => {
  it('starts anew from the readings after ten years, with the machine factors it had', () => {
    const state = startUnit(unit);
    advance(unit, state, scanAt(0, 0, 300), HOURS);
    state.factors.discharge.log = 0.03;
    state.factors.discharge.variance = 1e-4;
    const late = scanAt(3650 * DAY_MS, 0, 300);
    const step = advance(unit, state, late, HOURS);
    const fresh = advance(unit, startUnit(unit), late, HOURS);
    // Heat is stored in rock whose heat capacity the machine factors have told something of.
    const bare = (stores: typeof fresh.estimate.stores) =>
      Object.values(stores).map((s) => ({ ...s, stored_MWh_th: 0, stored_sigma_MWh_th: 0 }));
    expect(bare(step.estimate.stores)).toEqual(bare(fresh.estimate.stores));
    for (const [id, store] of Object.entries(step.estimate.stores)) {
      const other = fresh.estimate.stores[id]?.stored_MWh_th as number;
      expect(Math.abs(store.stored_MWh_th - other)).toBeLessThan(store.stored_sigma_MWh_th);
    }
    expect(state.factors.discharge.log).toBe(0.03);
    expect(step.events.map((e) => [e.kind, e.transition])).toContainEqual(['data_stale', 'raised']);
  });

  it('forgets as well where the day passed in empty scans', () => {
    // A day of scans, though not of so many: one comes empty, one does not come, in turn.
    const slow = { ...unit, scan_period_s: 1800 };
    const state = startUnit(slow);
    advance(slow, state, scanAt(0, 0, 300), HOURS);
    const nothing = { hours_at_W: [], profile: false };
    for (let hour = 1; hour <= 25; hour++) {
      const empty = scanAt(hour * 3600_000, 0, 300);
      empty.values.fill(Number.NaN);
      advance(slow, state, empty, nothing);
    }
    const late = scanAt(25.5 * 3600_000, 0, 300);
    const step = advance(slow, state, late, HOURS);
    const fresh = advance(slow, startUnit(slow), late, HOURS);
    expect(step.estimate.stores).toEqual(fresh.estimate.stores);
  });
});

describe('a cold pipe', () => {
  it('does not end a discharge that begins', () => {
    const warm = startUnit(unit);
    const cold = startUnit(unit);
    for (const [state, pipe] of [
      [warm, 730],
      [cold, 330],
    ] as const) {
      advance(unit, state, scanAt(0, 0, pipe), HOURS);
      advance(unit, state, scanAt(30_000, -1, pipe), HOURS);
    }
    const ask = (state: typeof warm, pipe: number) =>
      advance(unit, state, scanAt(60_000, -1, pipe), HOURS).estimate.dispatch?.[0]?.hours.p50 ?? 0;
    const full = ask(warm, 730);
    expect(full).toBeGreaterThan(1);
    // What lies in pipe and lid is some ten minutes of flow at the very most.
    expect(Math.abs(ask(cold, 330) - full)).toBeLessThan(0.2);
  });
});

describe('a store that has not started', () => {
  it('gives nothing firm, and names the thermocouples that read what no plant produces', () => {
    const state = startUnit(unit);
    const scan = scanAt(0, 0, 300);
    unit.channels.forEach((channel, i) => {
      if (channel.role.kind === 'thermocouple') scan.values[i] = 1100;
    });
    const { estimate } = advance(unit, state, scan, HOURS);
    const hours = estimate.dispatch?.[0]?.hours;
    expect(hours).toMatchObject({ p90: 0, p50: 0 });
    expect(hours?.p10).toBeGreaterThan(5); // anything up to a full unit's
    expect(estimate.quality).toBe('blind');
    const verdicts = Object.values(estimate.stores).flatMap((s) => s.sensors.rejected);
    expect(verdicts.length).toBeGreaterThan(0);
    expect(new Set(verdicts.map((v) => v.verdict))).toEqual(new Set(['burst']));
  });
});
