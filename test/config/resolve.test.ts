import { describe, expect, it } from 'vitest';
import { RAW_UNITS } from '../../src/core/units.js';
import { EXAMPLES, siteOf } from './sites.js';

describe('a sound site', () => {
  it('is in SI units and kelvin', () => {
    const unit = siteOf('demo').units[0]!;
    const [hot, cold] = unit.stores;
    expect(unit.rated_power_W).toBe(1.8e6);
    expect(unit.hours_at_W).toEqual([1.8e6, 1.2e6]);
    expect(unit.ambient_K).toBeCloseTo(283.15, 9);
    expect(hot!.reference_hot_K).toBeCloseTo(733.15, 9);
    expect(cold!.reference_cold_K).toBeCloseTo(144.15, 9);
    expect(hot!.bed.particle_diameter_m).toBeCloseTo(0.02, 12);
    expect(hot!.bed.pressure_Pa).toBeCloseTo(7.9e5, 6);
    // pi/4 6.6^2
    expect(hot!.bed.area_m2).toBeCloseTo(34.2119, 4);
    expect(hot!.bed.end_capacity_J_K.charge_inlet).toBe(900e3);
    expect(unit.limits.pressure_drop_max_Pa).toBe(3000);
    expect(unit.limits.hot_outlet_min_K).toBeCloseTo(633.15, 9);
    expect(unit.machine).toMatchObject({ kind: 'gas_cycle', auxiliary_running_W: 40e3 });
  });

  it('takes what is not given from the defaults that the reference tells', () => {
    const { units, mqtt, influx, http, store, clock_tolerance_s } = siteOf('demo', (d) => {
      for (const key of ['mqtt', 'store']) delete d[key];
      delete d.units[0].hours_at_MW_el;
    });
    const unit = units[0]!;
    expect(unit.hours_at_W).toEqual([1.8e6]);
    // 2 % of 36 kg/s; five periods of 30 s.
    expect(unit.estimator.stand_flow_kg_s).toBeCloseTo(0.72, 12);
    expect(unit.watch.data_age_s.limit).toBe(150);
    expect(mqtt).toMatchObject({
      url: null,
      embedded_host: '127.0.0.1',
      embedded_port: 1883,
      protocol: 4,
      qos: 1,
    });
    expect(clock_tolerance_s).toBe(300);
    expect(influx).toBeNull();
    expect(http).toEqual({
      ...{ host: '127.0.0.1', port: 8080, path_prefix: '', tls: null, login_by_proxy: false },
      ...{ tokens: [], tokens_inline: [], tokens_file: null },
    });
    expect(store.folder).toMatch(/\/config\/data$/);
  });

  it('is frozen to the last list', () => {
    const site = siteOf('demo');
    const open: string[] = [];
    const walk = (value: unknown, path: string): void => {
      if (value === null || typeof value !== 'object' || ArrayBuffer.isView(value)) return;
      if (!Object.isFrozen(value)) open.push(path);
      for (const [key, part] of Object.entries(value)) walk(part, `${path}.${key}`);
    };
    walk(site, 'site');
    expect(open).toEqual([]);
  });

  it.each(EXAMPLES)(
    '%s names every channel once as a source, in units that the core knows',
    (name) => {
      const site = siteOf(name);
      for (const unit of site.units) {
        const ids = unit.channels.map((c) => c.id);
        const fed = site.sources.filter((s) => s.unit === unit.id).flatMap((s) => s.channels);
        expect([...fed].sort()).toEqual([...ids].sort());
        expect(new Set(ids).size).toBe(ids.length);
        for (const channel of unit.channels) expect(RAW_UNITS).toContain(channel.raw_unit);
      }
      expect(new Set(site.sources.map((s) => s.topic)).size).toBe(site.sources.length);
    },
  );
});

describe('strings', () => {
  it('stand for the ring between the mid-radii', () => {
    const [hot] = siteOf('demo').units[0]!.stores;
    // Radii 0.5, 1.8, 2.9 in 3.3 m: edges at 1.15 and 2.35 m.
    const edges = [0, 1.15, 2.35, 3.3];
    hot!.strings.forEach((string, k) => {
      expect(string.area_share).toBeCloseTo((edges[k + 1]! ** 2 - edges[k]! ** 2) / 3.3 ** 2, 12);
    });
    expect(hot!.strings.reduce((sum, s) => sum + s.area_share, 0)).toBeCloseTo(1, 12);
  });

  it('at one radius share their ring evenly', () => {
    const [rock] = siteOf('hot-air', (d) => {
      d.units[0].stores[0].strings[1].radius_m = 0.4;
    }).units[0]!.stores;
    expect(rock!.strings.map((s) => s.area_share)).toEqual([0.5, 0.5]);
  });

  it('take explicit shares, scaled to add up to 1', () => {
    const [rock] = siteOf('hot-air', (d) => {
      d.units[0].stores[0].strings[0].area_share = 0.333;
      d.units[0].stores[0].strings[1].area_share = 0.666;
    }).units[0]!.stores;
    expect(rock!.strings[0]!.area_share).toBeCloseTo(1 / 3, 12);
    expect(rock!.strings[1]!.area_share).toBeCloseTo(2 / 3, 12);
  });

  it('counted from the bottom run from the charge inlet on top, in the order of the message', () => {
    const site = siteOf('salt-thermocline');
    const [centre] = site.units[0]!.stores[0]!.strings;
    const x = centre!.thermocouples.map((t) => t.position_m);
    expect(x).toEqual([...x].sort((a, b) => a - b));
    // The first entry, 0.3 m above the bottom of 6.1 m, is the farthest from the inlet.
    expect(centre!.thermocouples.at(-1)).toMatchObject({ id: 'T_01' });
    expect(x.at(-1)).toBeCloseTo(5.8, 12);
    const source = site.sources.find((s) => s.topic === 'plant/salt/tank/centre')!;
    expect(source.payload).toBe('array');
    expect(source.channels.slice(0, 2)).toEqual(['T_01', 'T_02']);
  });

  it('of single values get a topic each', () => {
    const topics = siteOf('hot-air').sources.map((s) => [s.topic, s.channels[0], s.payload]);
    expect(topics).toContainEqual(['air1/rock/TT_101', 'TT_101', 'value']);
    expect(topics).toContainEqual(['air1/rock/TT_205', 'TT_205', 'value']);
  });
});

describe('channels', () => {
  const channel = (id: string) => siteOf('hot-air').units[0]!.channels.find((c) => c.id === id)!;

  it('carry their voltage, type and cold junction', () => {
    expect(channel('TT_101')).toMatchObject({
      raw_unit: 'mV',
      thermocouple_type: 'N',
      cold_junction: 'card1_junction',
      role: { kind: 'thermocouple', store: 'rock', string: 'axis' },
      reporting: { kind: 'by_exception', deadband: 0.5, longest_silence_s: 300 },
    });
  });

  it('state their deadband in SI', () => {
    const unit = siteOf('hot-air', (d) => {
      d.units[0].channels[3].reporting = {
        kind: 'by_exception',
        deadband: 2,
        longest_silence_s: 60,
      };
      d.units[0].channels[6].unit = 'degF';
      d.units[0].channels[6].reporting.deadband = 9;
    }).units[0]!;
    const deadband = (id: string) => {
      const { reporting } = unit.channels.find((c) => c.id === id)!;
      return reporting.kind === 'by_exception' ? reporting.deadband : null;
    };
    expect(deadband('power')).toBe(2000);
    expect(deadband('ambient')).toBeCloseTo(5, 12);
  });

  it('may have a fixed cold junction', () => {
    const unit = siteOf('hot-air', (d) => {
      const axis = d.units[0].stores[0].strings[0];
      delete axis.cold_junction;
      axis.cold_junction_degC = 25;
    }).units[0]!;
    expect(unit.channels[0]!.cold_junction).toBeCloseTo(298.15, 9);
  });
});

describe("materials of one's own", () => {
  it('as a table have that heat capacity and its integral', () => {
    const [tank] = siteOf('salt-thermocline', (d) => {
      const { solid } = d.units[0].stores[0].bed;
      solid.temperature_degC = [200, 300, 400];
      solid.heat_capacity_J_kgK = [900, 1000, 1200];
    }).units[0]!.stores;
    const { solid } = tank!.bed;
    expect(solid.heatCapacity(350 + 273.15)).toBeCloseTo(1100, 9);
    expect(solid.enthalpy(400 + 273.15) - solid.enthalpy(200 + 273.15)).toBeCloseTo(
      95e3 + 110e3,
      6,
    );
  });

  it('as a polynomial have that heat capacity in kelvin', () => {
    const [tank] = siteOf('salt-thermocline', (d) => {
      d.units[0].stores[0].bed.solid = {
        given_as: 'polynomial',
        name: 'own rock',
        density_kg_m3: 2700,
        conductivity_W_mK: 2,
        coefficients: [600, 0.5],
        valid_from_degC: 0,
        valid_to_degC: 500,
      };
    }).units[0]!.stores;
    expect(tank!.bed.solid.heatCapacity(600)).toBeCloseTo(900, 9);
  });
});
