import { describe, expect, it } from 'vitest';
import type { LimitsDefinition } from '../../../src/core/definitions.js';
import { limitedAnswers, limitedBy } from '../../../src/core/plan/limitedBy.js';
import { limitsAhead } from '../../../src/core/plan/limitsAhead.js';
import { unitOf } from '../track/plants.js';

const plain = unitOf();
const HOUR = 3600;
/** In Berlin 16:00 on a day of 24 hours. */
const NOW = Date.UTC(2026, 0, 15, 15);
const at = (hours: number) => NOW + hours * HOUR * 1000;

const limits: LimitsDefinition = {
  ...plain.limits,
  operation: {
    ramp_W_s: { charge: 50, discharge: 50 },
    start: {
      warm: { time_s: 600, energy_J: 1e6 },
      cold: { time_s: 1200, energy_J: 2e6 },
      cold_after_s: 3600,
    },
    change_over_s: 600,
  },
  connection: {
    time_zone: 'Europe/Berlin',
    export_max_W: 85e3,
    import_max_W: 150e3,
    windows: [{ from_min: 17 * 60, to_min: 20 * 60, export_max_W: 50e3, import_max_W: 150e3 }],
  },
  outages: [
    { from_ms: at(8), to_ms: at(20), discharge_max_W: 0, charge_max_W: 150e3, reason: 'check' },
    { from_ms: at(60), to_ms: at(61), discharge_max_W: 0, charge_max_W: 0, reason: 'later' },
  ],
};
const unit = unitOf({ limits });

describe('hours at a power', () => {
  // Discharging from 15 to 90 kW; the connection gives 85 kW, from 17:00 on 50 kW; out from 24:00.
  it.each([
    [14e3, 3, 'below_least_power'],
    [95e3, 0.5, 'connection'],
    [88e3, 0.5, 'connection'],
    [60e3, 0.9, null],
    [60e3, 1.1, 'connection'],
    [45e3, 7.9, null],
    [45e3, 8.1, 'outage'],
    [60e3, 0, null],
  ])('of %i W for %f h are limited by %s', (power_W, hours, cause) => {
    expect(limitedBy(unit, 'discharge', power_W, NOW, hours * HOUR)).toBe(cause);
  });

  it('are limited by the machine alone where nothing else is configured', () => {
    expect(limitedBy(plain, 'discharge', 95e3, NOW, HOUR)).toBe('above_greatest_power');
    expect(limitedBy(plain, 'discharge', 90e3, NOW, HOUR)).toBeNull();
  });

  it('of charging are limited by what may be taken', () => {
    expect(limitedBy(unit, 'charge', 150e3, NOW, 9 * HOUR)).toBeNull();
    expect(limitedBy(unit, 'charge', 160e3, NOW, 1 * HOUR)).toBe('connection');
    expect(limitedBy(unit, 'charge', 19e3, NOW, 1 * HOUR)).toBe('below_least_power');
  });

  it('keep their figures; those of one power are judged up to p10', () => {
    const hours = { p90: 0.5, p50: 0.9, p10: 1.1 };
    const energy_MWh_el = { p90: 0.03, p50: 0.054, p10: 0.066 };
    const answer = { power_MW: 0.06, hours, energy_MWh_el, ends_by: 'hot_outlet' } as const;
    const [limited] = limitedAnswers(unit, new Date(NOW).toISOString(), [answer]);
    expect(limited).toEqual({ ...answer, limited_by: 'connection' });
  });

  it('refuse a power that is none', () => {
    expect(() => limitedBy(unit, 'discharge', Number.NaN, NOW, HOUR)).toThrow(RangeError);
  });
});

describe('limits ahead of a time', () => {
  it('are those of now, of the next change, and the outages of two days', () => {
    const { connection, outages } = limitsAhead(limits, NOW);
    expect(connection).toEqual({
      now: { export_max_W: 85e3, import_max_W: 150e3 },
      next: { time_ms: at(1), export_max_W: 50e3, import_max_W: 150e3 },
    });
    expect(outages.map(({ reason }) => reason)).toEqual(['check']);
  });

  it('within a window are its own, until it closes', () => {
    const { connection } = limitsAhead(limits, at(2));
    expect(connection).toEqual({
      now: { export_max_W: 50e3, import_max_W: 150e3 },
      next: { time_ms: at(4), export_max_W: 85e3, import_max_W: 150e3 },
    });
    // At the very instant it has closed: the next is that of the following day.
    expect(limitsAhead(limits, at(4)).connection).toMatchObject({
      now: { export_max_W: 85e3 },
      next: { time_ms: at(25) },
    });
  });

  it('pass over an edge at which nothing changes', () => {
    const twice = { from_min: 20 * 60, to_min: 22 * 60, export_max_W: 50e3, import_max_W: 150e3 };
    const connection = limits.connection!;
    const windows = [...connection.windows, twice];
    const found = limitsAhead({ ...limits, connection: { ...connection, windows } }, at(2));
    expect(found.connection!.next!.time_ms).toBe(at(6));
  });

  it('are none where none is configured, and do not change without windows', () => {
    expect(limitsAhead(plain.limits, NOW)).toEqual({ connection: null, outages: [] });
    const connection = { ...limits.connection!, windows: [] };
    expect(limitsAhead({ ...plain.limits, connection }, NOW).connection!.next).toBeNull();
  });

  it('tell an outage that stands, and no longer one that has ended', () => {
    expect(limitsAhead(limits, at(19)).outages.map((o) => o.reason)).toEqual(['check', 'later']);
    expect(limitsAhead(limits, at(20)).outages.map((o) => o.reason)).toEqual(['later']);
  });
});
