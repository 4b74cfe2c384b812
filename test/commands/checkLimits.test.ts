import { describe, expect, it } from 'vitest';
import { limitFacts } from '../../src/commands/check/limitFacts.js';
import { missingLimits } from '../../src/commands/check/missingLimits.js';
import { startNotes } from '../../src/commands/check/notes.js';
import { type Block, siteOf } from '../config/sites.js';

const unitOf = (change: (limits: Block) => void = () => {}) =>
  siteOf('demo', (d) => change(d.units[0].limits)).units[0]!;

describe('facts of the limits', () => {
  it('of the demonstration are those reckoned by hand', () => {
    const { charge, discharge, ...rest } = limitFacts(unitOf());
    // Discharge at 1.8 MW: 6 min of start, 1.8/0.3 = 6 min of ramp; cold 20 min; out of a charge at
    // 3.6 MW 3.6/0.4 = 9 min down, 10 min over, 6 min start, 6 min up.
    expect(discharge.from_warm_min).toBeCloseTo(12, 9);
    expect(discharge.from_cold_min).toBeCloseTo(26, 9);
    expect(discharge.from_other_direction_min).toBeCloseTo(31, 9);
    expect(discharge.ramp_down_min).toBeCloseTo(6, 9);
    // 48 min at 1.8 MW, 6 min at 0.9 on average, 8 kWh drawn: 1.522 of 1.8 MWh.
    expect(discharge.first_hour_lacks_warm_MWh_el).toBeCloseTo(1.8 - (1.44 + 0.09 - 0.008), 9);
    // Charge at 3.6 MW: 45 min, 9 min at 1.8 on average, 8 kWh drawn meanwhile.
    expect(charge.first_hour_lacks_warm_MWh_el).toBeCloseTo(3.6 - (2.7 + 0.27 + 0.008), 9);
    // 17:00 to 20:00 lets in 2.8 MW; 11:00 to 14:00 still lets out 1.9 MW.
    expect(charge.connected_h_d).toBe(21);
    expect(discharge.connected_h_d).toBe(24);
    expect(rest).toEqual({
      cold_after_h: 12,
      // 6 kW.
      standing_MWh_el_d: 0.144,
      time_zone: 'Europe/Berlin',
      outages: 0,
      availability: 0.97,
    });
  });

  it('count a window over midnight, and a connection that is too small all day', () => {
    const { charge, discharge } = limitFacts(
      unitOf((l) => {
        l.connection.windows = [{ from: '22:30', to: '06:00', export_max_MW_el: 1 }];
        l.connection.import_max_MW_el = 3;
      }),
    );
    expect(discharge.connected_h_d).toBe(16.5);
    expect(charge.connected_h_d).toBe(0);
  });

  it('name each limit that is missing, with what its absence costs', () => {
    const bare = unitOf((l) => {
      for (const key of ['operation', 'connection', 'availability']) delete l[key];
      l.discharge.power_min_MW_el = 0;
    });
    const missing = missingLimits(bare);
    expect(missing.map((m) => m.limit)).toEqual([
      'operation.ramp_MW_per_min.charge',
      'discharge.power_min_MW_el',
      'operation.ramp_MW_per_min.discharge',
      'operation.start',
      'operation.change_over_min',
      'connection',
      'outages',
      'availability',
    ]);
    // A minute of ramp to 1.8 MW: half of 30 kWh.
    expect(missing[2]!.costs).toMatch(/to 1\.8 MW_el leaves 15 kWh_el/);
    expect(missing[3]!.costs).toMatch(/leaves 30 kWh_el/);
    expect(missingLimits(unitOf()).map((m) => m.limit)).toEqual(['outages']);
    const warmOnly = unitOf((l) => {
      delete l.operation.start.cold;
      delete l.operation.start.cold_after_h;
    });
    expect(missingLimits(warmOnly).map((m) => m.limit)).toContain('operation.start.cold');
  });

  it('say that a start needs more than a window lets in', () => {
    const notes = startNotes(
      unitOf((l) => {
        // 900 kWh in 20 min is 2.7 MW.
        l.operation.start.cold.energy_kWh_el = 900;
        l.connection.windows[1].import_max_MW_el = 2.5;
      }),
    );
    expect(notes).toEqual([
      'a cold start draws 2.700 MW_el, more than a window of the connection lets in (2.500 MW_el)',
    ]);
    expect(startNotes(unitOf())).toEqual([]);
  });
});
