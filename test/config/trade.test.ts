import { describe, expect, it } from 'vitest';
import { type Block, exampleData, faultsOf, parseData, siteOf } from './sites.js';

const unitOf = (change: (limits: Block, unit: Block) => void) =>
  siteOf('demo', (d) => change(d.units[0].limits, d.units[0])).units[0]!;

describe('limits of what a unit can sell', () => {
  it('are in SI units, seconds and epoch times', () => {
    const { limits } = unitOf((l) => {
      l.outages = [
        {
          from: '2027-03-28T00:30:00+01:00',
          to: '2027-03-28T04:00:00+02:00',
          charge_max_MW_el: 1.2,
          reason: 'check of a valve',
        },
      ];
    });
    expect(limits.operation).toEqual({
      // 0.4 and 0.3 MW a minute.
      ramp_W_s: { charge: 0.4e6 / 60, discharge: 0.3e6 / 60 },
      start: {
        warm: { time_s: 360, energy_J: 8 * 3.6e6 },
        cold: { time_s: 1200, energy_J: 40 * 3.6e6 },
        cold_after_s: 12 * 3600,
      },
      change_over_s: 600,
    });
    expect(limits.connection).toEqual({
      time_zone: 'Europe/Berlin',
      export_max_W: 2e6,
      import_max_W: 3.8e6,
      windows: [
        { from_min: 660, to_min: 840, export_max_W: 1.9e6, import_max_W: 3.8e6 },
        { from_min: 1020, to_min: 1200, export_max_W: 2e6, import_max_W: 2.8e6 },
      ],
    });
    // In UTC 23:30 of the day before and 02:00: 2.5 h.
    expect(limits.outages).toEqual([
      {
        from_ms: Date.UTC(2027, 2, 27, 23, 30),
        to_ms: Date.UTC(2027, 2, 28, 2),
        discharge_max_W: 0,
        charge_max_W: 1.2e6,
        reason: 'check of a valve',
      },
    ]);
    expect(limits.availability).toBe(0.97);
  });

  it('may all be absent', () => {
    const { limits } = unitOf((l) => {
      for (const key of ['operation', 'connection', 'availability']) delete l[key];
    });
    for (const key of ['operation', 'connection', 'outages', 'availability']) {
      expect(limits).not.toHaveProperty(key);
    }
  });

  it('of a start-up fall back on what the reference says', () => {
    const { operation } = unitOf((l) => {
      l.operation = { start: { warm: { time_min: 10 } } };
    }).limits;
    // 6 kW of standing auxiliaries over 10 min.
    const warm = { time_s: 600, energy_J: 6e3 * 600 };
    expect(operation).toEqual({
      ramp_W_s: { charge: null, discharge: null },
      start: { warm, cold: warm, cold_after_s: Number.POSITIVE_INFINITY },
      change_over_s: 0,
    });
    const bare = unitOf((l) => {
      l.operation = {};
    }).limits.operation!;
    expect(bare.start.warm).toEqual({ time_s: 0, energy_J: 0 });
  });

  it('take clock times with and without quotation marks', () => {
    const site = exampleData('demo');
    site.units[0].limits.connection.windows = [{ from: '07:00', to: '24:00', import_max_MW_el: 1 }];
    const text = JSON.stringify(site).replaceAll('"07:00"', '07:00');
    expect(text).toContain('"from":07:00');
    const [window] = parseData(site).site!.units[0]!.limits.connection!.windows;
    expect(window).toMatchObject({ from_min: 420, to_min: 1440 });
  });
});

type Case = readonly [
  what: string,
  change: (l: Block, u: Block) => void,
  at: string,
  words: RegExp,
];

const OUTAGE = { from: '2027-01-01T00:00:00Z', to: '2027-01-02T00:00:00Z', reason: 'x' };
const window = (from: string, to: string, most: object = { import_max_MW_el: 1 }) => ({
  from,
  to,
  ...most,
});

const CASES: readonly Case[] = [
  [
    'a ramp that never reaches least power',
    (l) => (l.operation.ramp_MW_per_min.charge = 0.01),
    'operation.ramp_MW_per_min.charge',
    /at least 0\.0133 MW_el\/min, so that power_min_MW_el is reached within an hour.*0\.8 MW_el/s,
  ],
  [
    'a ramp that takes days',
    (l) => {
      l.discharge.power_min_MW_el = 0;
      l.operation.ramp_MW_per_min.discharge = 0.001;
    },
    'operation.ramp_MW_per_min.discharge',
    /power_max_MW_el is reached within a day/,
  ],
  [
    'a cold start without when',
    (l) => delete l.operation.start.cold_after_h,
    'operation.start.cold_after_h',
    /after how many hours/,
  ],
  [
    'when a start is cold without what it takes',
    (l) => delete l.operation.start.cold,
    'operation.start.cold',
    /what a cold start takes/,
  ],
  [
    'a cold start that is quicker than a warm one',
    (l) => (l.operation.start.cold.time_min = 5),
    'operation.start.cold.time_min',
    /at least what a warm start takes \(6\)/,
  ],
  [
    'a start that draws more than the connection imports',
    (l) => (l.operation.start.cold.energy_kWh_el = 1300),
    'operation.start.cold.energy_kWh_el',
    /at most 1270 kWh_el: over 20 min/,
  ],
  [
    'a start that draws less than the auxiliaries',
    (l) => (l.operation.start.warm.energy_kWh_el = 0.5),
    'operation.start.warm.energy_kWh_el',
    /at least 0\.6 kWh_el/,
  ],
  [
    'energy drawn in no time',
    (l) => (l.operation.start.warm = { time_min: 0, energy_kWh_el: 5 }),
    'operation.start.warm.energy_kWh_el',
    /0, or a time_min above 0/,
  ],
  [
    'a time zone of no list',
    (l) => (l.connection.time_zone = 'Europe/Vellmoor'),
    'connection.time_zone',
    /IANA list/,
  ],
  [
    'a time zone without summer time',
    (l) => (l.connection.time_zone = 'CEST'),
    'connection.time_zone',
    /CEST/,
  ],
  [
    'a connection below rated power',
    (l) => {
      l.connection.export_max_MW_el = 1.5;
      l.connection.windows = [];
    },
    'rated_power_MW_el',
    /export_max_MW_el \(1\.5\)/,
  ],
  [
    'a connection below least charging power',
    (l) => {
      l.connection.import_max_MW_el = 0.5;
      l.connection.windows = [];
    },
    'connection.import_max_MW_el',
    /power_min_MW_el \(0\.8\).*never charge/s,
  ],
  [
    'a window above the connection',
    (l) => (l.connection.windows[1].import_max_MW_el = 4),
    'connection.windows[1].import_max_MW_el',
    /at most import_max_MW_el of the connection \(3\.8\)/,
  ],
  [
    'a window that limits nothing',
    (l) => delete l.connection.windows[1].import_max_MW_el,
    'connection.windows[1]',
    /less than the connection in one direction/,
  ],
  [
    'windows that overlap',
    (l) => (l.connection.windows[1].from = '13:59'),
    'connection.windows[1]',
    /13:59 to 20:00.*apart from windows\[0\], 11:00 to 14:00/s,
  ],
  [
    'windows that overlap past midnight',
    (l) => (l.connection.windows = [window('22:00', '02:00'), window('01:30', '03:00')]),
    'connection.windows[1]',
    /apart from windows\[0\], 22:00 to 02:00/,
  ],
  [
    'a window without length',
    (l) => (l.connection.windows = [window('07:00', '07:00')]),
    'connection.windows[0].to',
    /another time than from/,
  ],
  [
    'a time of day that is none',
    (l) => (l.connection.windows[0].from = '7 am'),
    'connection.windows[0].from',
    /a time of day.*such as 17:00/,
  ],
  [
    'a window that begins at 24:00',
    (l) => (l.connection.windows = [window('24:00', '02:00')]),
    'connection.windows[0].from',
    /00:00 to 23:59/,
  ],
  [
    'an outage that ends before it begins',
    (l) => (l.outages = [{ ...OUTAGE, to: '2026-12-31T23:59:00Z' }]),
    'outages[0].to',
    /later than from/,
  ],
  [
    'an outage without an offset',
    (l) => (l.outages = [{ ...OUTAGE, from: '2027-01-01T00:00:00' }]),
    'outages[0].from',
    /ISO 8601 with its offset/,
  ],
  [
    'an outage above greatest power',
    (l) => (l.outages = [{ ...OUTAGE, discharge_max_MW_el: 2.5 }]),
    'outages[0].discharge_max_MW_el',
    /power_max_MW_el \(2\)/,
  ],
  [
    'an outage that is none',
    (l) => (l.outages = [{ ...OUTAGE, discharge_max_MW_el: 2, charge_max_MW_el: 3.6 }]),
    'outages[0].discharge_max_MW_el',
    /less in one direction/,
  ],
  [
    'an outage without a reason',
    (l) => (l.outages = [{ ...OUTAGE, reason: '' }]),
    'outages[0].reason',
    /text/,
  ],
  ['availability in percent', (l) => (l.availability = 97), 'availability', /up to 1/],
];

describe('faults of these limits', () => {
  it.each(CASES)('name %s', (_, change, at, words) => {
    const faults = faultsOf('demo', (d) => change(d.units[0].limits, d.units[0]));
    const path = at.startsWith('rated') ? `units[0].${at}` : `units[0].limits.${at}`;
    expect(faults.map((f) => f.path)).toContain(path);
    const own = faults.find((f) => f.path === path)!;
    expect(`${own.found} ${own.expected} ${own.hint}`).toMatch(words);
    // What follows from one slip is not said again elsewhere, but for powers sold beyond it.
    expect(faults.filter((f) => f.path.includes('limits'))).toHaveLength(
      at.startsWith('rated') ? 0 : 1,
    );
  });

  it('leave windows that only touch alone, over midnight too', () => {
    const { connection } = unitOf((l) => {
      l.connection.windows = [
        window('22:00', '02:00'),
        window('02:00', '05:00'),
        window('20:00', '22:00'),
      ];
    }).limits;
    expect(connection!.windows).toHaveLength(3);
  });
});
