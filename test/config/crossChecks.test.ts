import { describe, expect, it } from 'vitest';
import { type Block, type Example, exampleData, faultsOf, parseData } from './sites.js';

type Case = readonly [
  what: string,
  example: Example,
  change: (unit: Block, site: Block) => void,
  path: string,
  words: RegExp,
];

const CASES: readonly Case[] = [
  [
    'late readings from before the journal',
    'demo',
    (_, site) => {
      site.store = { keep_readings_days: 1, thin_after_days: 30 };
    },
    'late.rewind_h',
    /at most store\.keep_readings_days \(1 d, which is 24 h\)/,
  ],
  [
    'late readings of where estimates are thinned',
    'demo',
    (_, site) => {
      site.late = { rewind_h: 100 };
      site.store = { thin_after_days: 4 };
    },
    'late.rewind_h',
    /at most store\.thin_after_days \(4 d, which is 96 h\)/,
  ],
  [
    'states further apart than they are kept',
    'demo',
    (_, site) => {
      site.late = { rewind_h: 0.5, rewind_point_every_s: 3600 };
    },
    'late.rewind_point_every_s',
    /at most late\.rewind_h \(0\.5 h\)/,
  ],
  [
    'a wait that is shorter than the quiet',
    'demo',
    (_, site) => {
      site.late = { quiet_s: 60, wait_most_s: 30 };
    },
    'late.wait_most_s',
    /at least late\.quiet_s \(60 s\)/,
  ],
  [
    'a thermocouple outside the bed',
    'demo',
    (u) => (u.stores[0].strings[0].positions_m[13] = 9.3),
    'units[0].stores[0].strings[0].positions_m[13]',
    /inside the bed, from 0 to 9\.2 m/,
  ],
  [
    'a string outside the bed',
    'demo',
    (u) => (u.stores[0].strings[2].radius_m = 3.4),
    'units[0].stores[0].strings[2].radius_m',
    /radius \(3\.3 m\)/,
  ],
  [
    'positions that turn back',
    'demo',
    (u) => (u.stores[0].strings[0].positions_m[3] = 0.5),
    'units[0].stores[0].strings[0].positions_m[3]',
    /one direction/,
  ],
  [
    'a position given twice',
    'demo',
    (u) => (u.stores[0].strings[0].positions_m[3] = u.stores[0].strings[0].positions_m[2]),
    'units[0].stores[0].strings[0].positions_m[3]',
    /above 1\.73/,
  ],
  [
    'ids used twice',
    'hot-air',
    (u) => (u.stores[0].strings[1].ids[2] = 'TT_103'),
    'units[0].stores[0].strings[1].ids[2]',
    /already at units\[0\]\.stores\[0\]\.strings\[0\]\.ids/,
  ],
  [
    'an id that a channel and a string share',
    'hot-air',
    (u) => (u.channels[3].id = 'TT_201'),
    'units[0].channels[3].id',
    /used once/,
  ],
  [
    'a channel called time',
    'hot-air',
    (u) => (u.channels[3].id = 'Time'),
    'units[0].channels[3].id',
    /first column/,
  ],
  [
    'too few ids',
    'hot-air',
    (u) => u.stores[0].strings[1].ids.pop(),
    'units[0].stores[0].strings[1].ids',
    /entries \(5\)/,
  ],
  [
    'a pattern without {n}',
    'hot-air',
    (u) => (u.stores[0].strings[0].ids = 'TT'),
    'units[0].stores[0].strings[0].ids',
    /pattern with \{n\}/,
  ],
  [
    'a pattern with an unknown word',
    'hot-air',
    (u) => (u.stores[0].strings[0].ids = 'TT_{m}_{n}'),
    'units[0].stores[0].strings[0].ids',
    /letters, digits/,
  ],
  [
    'two strings of a name',
    'demo',
    (u) => (u.stores[0].strings[1].id = 'axis'),
    'units[0].stores[0].strings[1].id',
    /another name/,
  ],
  [
    'the cold reference above the hot one',
    'demo',
    (u) => (u.stores[0].reference_cold_degC = 470),
    'units[0].stores[0].reference_cold_degC',
    /less than reference_hot_degC \(460\)/,
  ],
  [
    'a hot outlet limit above the reference',
    'demo',
    (u) => (u.limits.hot_outlet_min_degC = 480),
    'units[0].limits.hot_outlet_min_degC',
    /between the references of the hot store, 25 and 460/,
  ],
  [
    'a cold outlet limit below the reference',
    'demo',
    (u) => (u.limits.cold_outlet_max_degC = -150),
    'units[0].limits.cold_outlet_max_degC',
    /between the references of the cold store/,
  ],
  [
    'a limit for a store that is not there',
    'hot-air',
    (u) => (u.limits.cold_outlet_max_degC = -50),
    'units[0].limits.cold_outlet_max_degC',
    /no cold store/,
  ],
  [
    'a smallest power above the greatest',
    'demo',
    (u) => (u.limits.charge.power_min_MW_el = 5),
    'units[0].limits.charge.power_min_MW_el',
    /at most power_max_MW_el \(3\.6\)/,
  ],
  [
    'a smallest flow above the greatest',
    'demo',
    (u) => (u.limits.discharge.flow_min_kg_s = 37),
    'units[0].limits.discharge.flow_min_kg_s',
    /at most flow_max_kg_s \(36\)/,
  ],
  [
    'a rated power beyond the limits',
    'demo',
    (u) => (u.rated_power_MW_el = 2.5),
    'units[0].rated_power_MW_el',
    /from 0\.4 to 2 MW_el/,
  ],
  [
    'hours asked at a power beyond the limits',
    'demo',
    (u) => (u.hours_at_MW_el[1] = 0.1),
    'units[0].hours_at_MW_el[1]',
    /from 0\.4 to 2 MW_el/,
  ],
  [
    'an efficiency table that does not ascend',
    'hot-air',
    (u) => (u.machine.outlet_degC[2] = 390),
    'units[0].machine.outlet_degC[2]',
    /above the one before it \(400 degC\)/,
  ],
  [
    'an efficiency table of unequal lengths',
    'hot-air',
    (u) => u.machine.efficiency.pop(),
    'units[0].machine.efficiency',
    /\(6\)/,
  ],
  [
    'a heat capacity table that does not ascend',
    'salt-thermocline',
    (u) => (u.stores[0].bed.solid.temperature_degC[1] = 280),
    'units[0].stores[0].bed.solid.temperature_degC[1]',
    /above the one before it/,
  ],
  [
    'a heat capacity table of unequal lengths',
    'salt-thermocline',
    (u) => u.stores[0].bed.solid.heat_capacity_J_kgK.push(1100),
    'units[0].stores[0].bed.solid.heat_capacity_J_kgK',
    /\(2\)/,
  ],
  [
    'a topic used twice',
    'hot-air',
    (u) => (u.channels[5].topic = 'air1/top'),
    'units[0].channels[5].topic',
    /nothing else uses/,
  ],
  [
    'a topic that rockhour publishes on',
    'hot-air',
    (u) => (u.channels[4].topic = 'rockhour/air1/state'),
    'units[0].channels[4].topic',
    /outside mqtt\.out_prefix/,
  ],
  [
    'two stores of a kind',
    'demo',
    (u) => (u.stores[1].kind = 'hot'),
    'units[0].stores[1].kind',
    /at most one hot and one cold/,
  ],
  [
    'two stores of a name',
    'demo',
    (u) => (u.stores[1].id = 'hot'),
    'units[0].stores[1].id',
    /another id/,
  ],
  [
    'a gas cycle with one store',
    'demo',
    (u) => u.stores.pop(),
    'units[0].stores',
    /hot and a cold store/,
  ],
  [
    'a store with another gas than the machine',
    'demo',
    (u) => (u.stores[0].bed.fluid = 'nitrogen'),
    'units[0].stores[0].bed.fluid',
    /argon/,
  ],
  [
    'a store far from its side of the machine',
    'demo',
    (u) => (u.stores[1].pressure_bar = 7.9),
    'units[0].stores[1].pressure_bar',
    /machine\.low_pressure_bar \(1\.04 bar\)/,
  ],
  [
    'pressures the wrong way round',
    'demo',
    (u) => (u.machine.low_pressure_bar = 8),
    'units[0].machine.low_pressure_bar',
    /less than high_pressure_bar/,
  ],
  [
    'a channel of an unknown store',
    'demo',
    (u) => (u.channels[4].store = 'warm'),
    'units[0].channels[4].store',
    /hot, cold/,
  ],
  [
    'a quantity measured twice',
    'demo',
    (u) => (u.channels[5].end = 'charge_inlet'),
    'units[0].channels[5].measures',
    /one channel for each/,
  ],
  [
    'neither flow nor power',
    'demo',
    (u) => (u.channels = u.channels.filter((c: Block) => !['flow', 'power'].includes(c.id))),
    'units[0].channels',
    /flow or power/,
  ],
  [
    'an unsigned flow without a direction',
    'salt-thermocline',
    (u) => {
      u.channels[0].sense = 'unsigned';
      u.channels.pop();
    },
    'units[0].channels',
    /mode, valve or power/,
  ],
  [
    'a meter in one direction only',
    'hot-air',
    (u) => u.channels.splice(2, 1),
    'units[0].channels',
    /discharge too/,
  ],
  [
    'millivolts without a type',
    'hot-air',
    (u) => delete u.stores[0].strings[0].thermocouple_type,
    'units[0].stores[0].strings[0].thermocouple_type',
    /unit is mV/,
  ],
  [
    'millivolts without a cold junction',
    'hot-air',
    (u) => delete u.stores[0].strings[0].cold_junction,
    'units[0].stores[0].strings[0].cold_junction',
    /cold_junction_degC/,
  ],
  [
    'a cold junction that is no channel',
    'hot-air',
    (u) => (u.stores[0].strings[0].cold_junction = 'power'),
    'units[0].stores[0].strings[0].cold_junction',
    /card1_junction/,
  ],
  [
    'a cold junction of a reading in degC',
    'hot-air',
    (u) => (u.stores[0].strings[1].cold_junction_degC = 25),
    'units[0].stores[0].strings[1].cold_junction_degC',
    /no raw voltage/,
  ],
  [
    'area shares that miss 1',
    'hot-air',
    (u) => {
      u.stores[0].strings[0].area_share = 0.4;
      u.stores[0].strings[1].area_share = 0.5;
    },
    'units[0].stores[0].strings',
    /add up to 1/,
  ],
  [
    'an area share that is missing',
    'hot-air',
    (u) => (u.stores[0].strings[0].area_share = 0.4),
    'units[0].stores[0].strings[1].area_share',
    /every string/,
  ],
  [
    'one topic for many single values',
    'hot-air',
    (u) => (u.stores[0].strings[1].topic = 'air1/rim'),
    'units[0].stores[0].strings[1].topic',
    /\{id\} or \{n\}/,
  ],
  [
    'a silence shorter than a scan',
    'hot-air',
    (u) => (u.channels[6].reporting.longest_silence_s = 20),
    'units[0].channels[6].reporting.longest_silence_s',
    /scan period \(30 s\)/,
  ],
  [
    'pieces as large as the bed',
    'salt-thermocline',
    (u) => {
      u.stores[0].bed.diameter_m = 1;
      u.stores[0].bed.particle_diameter_mm = 400;
    },
    'units[0].stores[0].bed.particle_diameter_mm',
    /250 mm/,
  ],
  [
    'an alert that could never return',
    'demo',
    (u) => (u.watch = { spread_ratio: { limit: 1.3, deadband: 0.4 } }),
    'units[0].watch.spread_ratio.deadband',
    /less than limit - 1 \(0\.3\)/,
  ],
  [
    'an indicator whose alert could never return',
    'demo',
    (u) => (u.watch = { indicators: { string_flow: { limit: 0.05, deadband: 0.05 } } }),
    'units[0].watch.indicators.string_flow.deadband',
    /less than limit \(0\.05\)/,
  ],
  [
    'a heat transfer that would have to be more than healthy to count so again',
    'demo',
    (u) => (u.watch = { indicators: { heat_transfer: { limit: 0.8, deadband: 0.2 } } }),
    'units[0].watch.indicators.heat_transfer.deadband',
    /less than limit is away from 1 \(0\.2\)/,
  ],
  [
    'standing that looks like running',
    'demo',
    (u) => (u.estimator = { stand_flow_kg_s: 6 }),
    'units[0].estimator.stand_flow_kg_s',
    /seem to stand/,
  ],
  [
    'a thermocouple type that does not reach the temperatures',
    'hot-air',
    (u) => (u.stores[0].strings[0].thermocouple_type = 'T'),
    'units[0].stores[0].strings[0].thermocouple_type',
    /type T covers -270 to 400 degC/,
  ],
  [
    'a pressure ratio that the loop eats up',
    'demo',
    (u) => {
      Object.assign(u.machine, { high_pressure_bar: 1.06, loop_pressure_loss: 0.05 });
      u.stores[0].pressure_bar = 1.06;
    },
    'units[0].machine.loop_pressure_loss',
    /leaves the expander a pressure/,
  ],
  [
    'two units of a name',
    'demo',
    (u, site) => site.units.push({ ...structuredClone(u) }),
    'units[1].id',
    /another id/,
  ],
  [
    'one port for page and broker',
    'demo',
    (_, site) => (site.http = { port: 18830 }),
    'http.port',
    /another port/,
  ],
  [
    'two ways to a password',
    'hot-air',
    (_, site) => Object.assign(site.influx, { password_env: 'A', password_file: 'b' }),
    'influx.password_env',
    /one of/,
  ],
];

describe('contradictions between keys', () => {
  it.each(CASES)('%s is named', (_what, example, change, path, words) => {
    const faults = faultsOf(example, (d) => change(d.units[0], d));
    const fault = faults.find((f) => f.path === path);
    expect(fault, JSON.stringify(faults.map((f) => f.path))).toBeDefined();
    expect(fault!.expected).toMatch(words);
    expect(fault!.line).toBeGreaterThan(0);
  });

  it('warn of the hazard where the gas of a cold store would turn liquid', () => {
    // Argon at 10.5 bar boils at about -156 degC; the low side of this machine is set there.
    const faults = faultsOf('demo', (d) => {
      const u = d.units[0];
      Object.assign(u.machine, { low_pressure_bar: 10.5, high_pressure_bar: 60 });
      u.stores[0].pressure_bar = 60;
      u.stores[1].pressure_bar = 10.5;
      u.stores[1].reference_cold_degC = -160;
    });
    expect(faults).toHaveLength(1);
    expect(faults[0]).toMatchObject({
      path: 'units[0].stores[1].reference_cold_degC',
      found: '-160',
    });
    expect(faults[0]!.expected).toMatch(
      /above the dew point of the gas at 10\.5 bar, -155\.7 degC/,
    );
    expect(faults[0]!.hint).toMatch(/^HAZARD: the gas would turn liquid in the bed/);
  });

  it('let a cold store near ambient pressure go as far down', () => {
    const data = exampleData('demo');
    data.units[0].stores[1].reference_cold_degC = -160;
    expect(parseData(data).faults).toBeUndefined();
  });

  it('pass over a unit whose topics differ only by the unit', () => {
    const data = exampleData('demo');
    data.units.push({ ...structuredClone(data.units[0]), id: 'vellmoor2' });
    expect(parseData(data).faults).toBeUndefined();
  });
});
