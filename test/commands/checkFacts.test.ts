import { describe, expect, it } from 'vitest';
import { siteNotes } from '../../src/commands/check/siteNotes.js';
import { storeFacts } from '../../src/commands/check/storeFacts.js';
import { unitFacts } from '../../src/commands/check/unitFacts.js';
import { EXAMPLES, siteOf } from '../config/sites.js';

/** Rock bed with air of the hand case in the published checks: 500 degC, d 20 mm, eps 0.40, 1 atm. */
function handCase() {
  const [store] = siteOf('hot-air', (d) => {
    const s = d.units[0].stores[0];
    Object.assign(s, { reference_hot_degC: 501, reference_cold_degC: 499, pressure_bar: 1.01325 });
    Object.assign(s.bed, { particle_diameter_mm: 20, void_fraction: 0.4 });
    for (const key of ['hot_outlet_min_degC', 'charge_hot_outlet_max_degC']) {
      delete d.units[0].limits[key];
    }
  }).units[0]!.stores;
  return storeFacts(store!, 0.225 * store!.bed.area_m2, 288.15, 772.15);
}

describe('facts of a store', () => {
  it('are those of the published hand case', () => {
    // Fits of gas properties are good to 0.3 %; hv of Wakao & Kaguei is divided by 1 + Bi/5.
    const f = handCase();
    const near = (value: number, expected: number) =>
      expect(Math.abs(value / expected - 1)).toBeLessThan(0.005);
    near(f.reynolds, 123.18);
    near(f.prandtl, 0.7152);
    near(f.biot, (54.87 * 0.02) / (2 * 2.5));
    near(f.heat_transfer_kW_m3K, 9.877 / (1 + 0.2195 / 5));
    near(f.pressure_drop_charged_kPa, (128.98 * 6) / 1e3);
    // NTU = hv L/(G cf), cf of air at 500 degC 1092.4 J/kgK.
    near(f.ntu, ((9877 / (1 + 0.2195 / 5)) * 6) / (0.225 * 1092.4));
  });

  it('give the front speed measured in the salt tank', () => {
    const unit = siteOf('salt-thermocline').units[0]!;
    const f = storeFacts(unit.stores[0]!, 7.0, unit.ambient_K, 563.15);
    // Plug flow with 2.773e6 J/m3K at 7.0 kg/s, Pacheco et al. 2002: 1.944 m/h.
    expect(f.front_speed_m_h).toBeCloseTo(1.944, 3);
    expect(f.heat_capacity_kJ_m3K).toBeCloseTo(2773, 0);
    // Heat of the whole tank between its references: 43.118 m3 x 2.773e6 J/m3K x 106 K.
    expect(f.capacity_MWh_th).toBeCloseTo((43.118 * 2.7729e6 * 106) / 3.6e9, 2);
  });

  it('give the front width of the closed form', () => {
    const unit = siteOf('demo').units[0]!;
    const store = unit.stores[0]!;
    const f = storeFacts(store, 22, unit.ambient_K, 298.15);
    // sigma^2 of heat transfer alone: 2 L (G cf)/hv x (C v/(G cf)) = 2 L^2/NTU for a gas.
    const byTransfer = Math.sqrt((2 * store.bed.length_m ** 2) / f.ntu);
    expect(f.front_width_by_transfer_m).toBeCloseTo(byTransfer, 6);
    expect(f.front_width_m).toBeCloseTo(
      Math.hypot(f.front_width_by_transfer_m, f.front_width_by_conduction_m),
      9,
    );
    // Three strings of 14 thermocouples, 0.64 m apart.
    expect(f.spacing_m).toBeCloseTo(0.64, 9);
    expect(f.thermocouples_per_front).toBeCloseTo((2 * f.front_width_m) / 0.64, 6);
  });

  it('give the standing loss of mantle and ends', () => {
    const unit = siteOf('demo').units[0]!;
    const f = storeFacts(unit.stores[0]!, 22, unit.ambient_K, 298.15);
    const area = (Math.PI / 4) * 6.6 ** 2;
    const UA = Math.PI * 6.6 * 9.2 * 0.3 + area * (0.35 + 0.3);
    expect(f.standing_loss_kW).toBeCloseTo((UA * (460 - 10)) / 1e3, 9);
  });
});

describe('facts of a unit', () => {
  it('are those of the ideal argon cycle by hand', () => {
    const f = unitFacts(siteOf('demo').units[0]!);
    // cp 520.333 J/kgK, 7.9/1.04 bar, exponent 0.4: compression by r^(0.4/0.9), expansion by
    // (r (1 - 0.02)^2)^(0.4 0.91), both machines from 25 degC while charging.
    const r = 7.9 / 1.04;
    const up = r ** (0.4 / 0.9);
    const down = (r * 0.98 ** 2) ** -(0.4 * 0.91);
    const cp = 0.5203333;
    const T = 298.15;
    expect(f.charge.specific_work_kJ_kg).toBeCloseTo((cp * T * (up - 1 - (1 - down))) / 0.96, 6);
    expect(f.charge.hot_inlet_degC).toBeCloseTo(T * up - 273.15, 6);
    expect(f.charge.cold_inlet_degC).toBeCloseTo(T * down - 273.15, 6);
    const expansion = cp * 733.15 * (1 - down);
    const compression = cp * 144.15 * (up - 1);
    const work = 0.96 * (expansion - compression);
    expect(f.discharge.specific_work_kJ_kg).toBeCloseTo(work, 6);
    expect(f.discharge.flow_kg_s).toBeCloseTo((1800 + 40) / work, 6);
  });

  it.each(EXAMPLES)(
    'of %s: a settled cycle delivers its rated hours, gives less than it took, and less than sharp fronts would',
    (name) => {
      const f = unitFacts(siteOf(name).units[0]!);
      const { charge, discharge } = f.cycle;
      expect(discharge.hours).toBeGreaterThanOrEqual(f.rated_hours_h);
      // Constant power: energy is power times time, wherever the flow stayed within its range.
      expect(discharge.energy_MWh_el).toBeCloseTo(f.rated_power_MW_el * discharge.hours, 6);
      expect(f.round_trip).toBeCloseTo(discharge.energy_MWh_el / charge.energy_MWh_el, 12);
      expect(f.round_trip).toBeLessThan(1);
      expect(discharge.hours).toBeLessThan(Math.max(...Object.values(f.plug_flow_hours)));
    },
  );

  it('say what each channel that is not there costs, and what stands in for it', () => {
    const bare = siteOf('demo', (d) => {
      d.units[0].channels = d.units[0].channels.filter((c: { id: string }) => c.id === 'power');
    });
    const missing = unitFacts(bare.units[0]!).missing;
    expect(missing.map((m) => m.channel)).toEqual([
      'flow',
      'mode',
      'gas temperature, hot, charge_inlet',
      'gas temperature, hot, discharge_inlet',
      'pressure, hot',
      'pressure drop, hot',
      'shell temperature, hot',
      'gas temperature, cold, charge_inlet',
      'gas temperature, cold, discharge_inlet',
      'pressure, cold',
      'pressure drop, cold',
      'shell temperature, cold',
      'ambient temperature',
      'auxiliary power',
    ]);
    for (const m of missing) {
      expect(m.stands_in).toMatch(/\w{3}/);
      expect(m.costs).toMatch(/\w{3}/);
    }
  });

  it('say how seldom the indicators call a healthy unit degraded', () => {
    const often = siteOf('demo', (d) => {
      d.units[0].watch = { indicators: { in_control_days: 310 } };
    });
    expect(unitFacts(often.units[0]!).watch).toEqual({ indicators: 31, each_d: 310, unit_d: 10 });
  });

  it('point at what a person should look at', () => {
    const noted = (change: Parameters<typeof siteOf>[1]) =>
      unitFacts(siteOf('demo', change).units[0]!).notes.join('\n');
    expect(noted((d) => (d.units[0].rated_hours_h = 12))).toMatch(/less than the rated 12 h/);
    expect(noted((d) => (d.units[0].limits.charge_cold_outlet_min_degC = -40))).toMatch(
      /a charge down to charge_cold_outlet_min_degC ends with 301 degC/,
    );
    expect(noted((d) => (d.units[0].stores[1].reference_cold_degC = -180))).toMatch(
      /HAZARD: the gas in cold comes within 6 K of its dew point/,
    );
    expect(noted((d) => (d.units[0].limits.pressure_drop_max_kPa = 0.5))).toMatch(
      /exceed limits\.pressure_drop_max_kPa \(0\.5\)/,
    );
    expect(noted((d) => (d.units[0].stores[0].strings[0].positions_m = [0.5, 4.5, 8.5]))).toMatch(
      /hot: 0\.5 thermocouples per front/,
    );
  });
});

describe('notes on a site', () => {
  it('are silent where everything stays on this machine', () => {
    expect(siteNotes(siteOf('demo'))).toEqual([]);
  });

  it('warn of a page and a broker that are open to a network', () => {
    const site = siteOf('demo', (d) => {
      d.http = {
        host: '0.0.0.0',
        tokens: [{ name: 'a', role: 'view', hash: `sha256:${'0'.repeat(64)}` }],
      };
      d.mqtt.embedded_host = 'plant-gateway';
    });
    expect(siteNotes(site).map((note) => note.split(':')[0])).toEqual([
      'http.host 0.0.0.0',
      'mqtt.embedded_host plant-gateway',
    ]);
    const behind = siteOf('demo', (d) => {
      d.http = { host: '0.0.0.0', login_by_proxy: true };
    });
    expect(siteNotes(behind).join()).toMatch(/asks nobody who they are .* past the proxy/);
  });

  it('warn of passwords on an unencrypted line', () => {
    const site = siteOf('hot-air');
    const withPassword = { ...site, mqtt: { ...site.mqtt, password: 'x' } };
    expect(siteNotes(site)).toEqual([]);
    expect(siteNotes(withPassword)).toHaveLength(1);
    expect(
      siteNotes({ ...site, mqtt: { ...withPassword.mqtt, url: 'mqtts://broker:8883' } }),
    ).toEqual([]);
  });
});
