import { beforeAll, describe, expect, it } from 'vitest';
import type { Estimate, StoreEstimate } from '../../src/core/estimate.js';
import { channelOf, sandiaPoints } from '../published/measuredStores.js';
import { requireProgram } from '../support/requirements.js';
import { type ChainResult, MEASUREMENTS, runChain } from './measuredChain.js';
import {
  type MeasuredUnit,
  measuredUnits,
  rankOf,
  recordingOf,
  SALT_HEIGHT_M,
  sourceMs,
} from './measuredUnits.js';
import { expectedInInflux, sorted } from './readBack.js';

/**
 * Measured temperatures through the whole chain: mosquitto, daemon, SQLite, InfluxDB, each a
 * program of its own. Sources: heads of fixtures/sandia_pacheco2002_discharge_measured.csv (Pacheco,
 * Showalter, Kolb 2002) and fixtures/meier1991_rockbed_air_charge_measured.csv (Meier, Winkler,
 * Wuillemin 1991). Flow and inlet temperature of every minute and the uniform start of the rock bed
 * are constructed, and marked: see measuredUnits.ts.
 *
 * Every figure is read back twice: estimates from SQLite, and the same fields from InfluxDB.
 */
const mosquitto = requireProgram('mosquitto');
const influxd = requireProgram('influxd');
const UNITS = measuredUnits();
const LIST = Object.values(UNITS);

describe.skipIf(!mosquitto || !influxd)('measured stores through the whole chain', () => {
  let results: Map<string, ChainResult>;
  beforeAll(async () => {
    const programs = { mosquitto: mosquitto!, influxd: influxd! };
    results = await runChain(programs, LIST, recordingOf);
  }, 300_000);

  const of = (unit: MeasuredUnit) => results.get(unit.id)!;

  /** A store as SQLite has it. */
  function storeAt(unit: MeasuredUnit, time_s: number): StoreEstimate {
    const found = of(unit).stored.estimates.find(
      (one) => Date.parse(one.time) === sourceMs(time_s),
    );
    return Object.values(found!.stores)[0]!;
  }

  /** The only front of a store and its heat, once from each database. */
  function bothAt(unit: MeasuredUnit, time_s: number) {
    const store = storeAt(unit, time_s);
    expect(store.fronts).toHaveLength(1);
    const { influx } = of(unit);
    const at = (name: string) => influx[name]!.filter((row) => row.time === sourceMs(time_s));
    const [front] = at('rockhour_front');
    const [heat] = at('rockhour_store');
    expect(at('rockhour_front')).toHaveLength(1);
    return [
      {
        position_m: store.fronts[0]!.position_m,
        width_m: store.fronts[0]!.width_m,
        stored_MWh_th: store.stored_MWh_th,
        soc: store.soc,
      },
      {
        position_m: (front!.position_m ?? null) as number | null,
        width_m: (front!.width_m ?? null) as number | null,
        stored_MWh_th: heat!.stored_MWh_th as number,
        soc: heat!.soc as number,
      },
    ];
  }

  describe('the chain itself', () => {
    it.each(LIST.map((unit) => [unit.id, unit] as const))(
      '%s: an estimate of every minute, the same in SQLite, in InfluxDB and from a replay, to the last bit',
      (_, unit) => {
        const { stored, influx, replayed } = of(unit);
        const { estimates, events } = stored;
        expect(estimates.map(({ time }) => Date.parse(time))).toEqual(
          unit.rows.map(({ time_s }) => sourceMs(time_s)).slice(0, estimates.length),
        );
        expect(estimates.length).toBeGreaterThanOrEqual(unit.end_s / 60 + 1);
        expect(replayed).toHaveLength(unit.rows.length);
        const same = replayed.slice(0, estimates.length);
        // Hours come at each unit's own time within their interval; the replay has them of every scan.
        const asked = same.map(({ events: _e, dispatch, ...rest }, i) =>
          estimates[i]!.dispatch === undefined ? rest : { ...rest, dispatch },
        );
        expect(estimates).toEqual(asked);
        expect(events).toEqual(same.flatMap((line) => line.events));
        const expected = expectedInInflux(stored);
        expect(Object.keys(expected).sort()).toEqual([...MEASUREMENTS].sort());
        for (const name of MEASUREMENTS) {
          expect(sorted(influx[name]!), name).toEqual(sorted(expected[name]!));
        }
        expect(influx.rockhour_dispatch!.length).toBeGreaterThan(5);
      },
    );
  });

  describe('salt thermocline, discharging (Pacheco et al. 2002)', () => {
    // 343 degC crossings, widths and heat by straight lines between the points: from the bottom.
    it.each([
      [0, 0.845, null, 2.98],
      [1800, 1.82, 0.739, 2.42],
      [3600, 2.679, 0.959, 1.86],
    ])(
      'after %i s: crossing at %f m, width %s m, heat %f MWh above 290 degC',
      (time_s, x, width, heat) => {
        for (const found of bothAt(UNITS.salt, time_s)) {
          const crossing = SALT_HEIGHT_M - found.position_m!;
          console.info(
            `salt, ${time_s / 3600} h: crossing ${crossing.toFixed(3)} m (${x}), width ${found.width_m?.toFixed(3) ?? 'none'} m (${width ?? 'none'}), heat ${found.stored_MWh_th.toFixed(3)} MWh (${heat})`,
          );
          expect(Math.abs(crossing - x)).toBeLessThan(0.1);
          // At 0 h the lowest reading is 331 degC: no 16 % crossing, so no width.
          if (width === null) expect(found.width_m).toBeNull();
          else expect(Math.abs(found.width_m! - width)).toBeLessThan(0.15);
          // The published heat is at the tabulated heat capacity: what flow and front tell of it is taken out.
          const first = storeAt(UNITS.salt, 0);
          const tabulated = found.soc * (first.stored_MWh_th / first.soc);
          expect(Math.abs(tabulated / heat - 1)).toBeLessThan(0.03);
        }
      },
    );

    it('predicts the front at 1 h within 0.15 m from the scan of 0 h alone', () => {
      for (const found of bothAt(UNITS.saltStart, 3600)) {
        const crossing = SALT_HEIGHT_M - found.position_m!;
        console.info(`salt, 1 h from the scan of 0 h: ${crossing.toFixed(3)} m (2.679)`);
        expect(Math.abs(crossing - 2.679)).toBeLessThan(0.15);
      }
      expect(storeAt(UNITS.saltStart, 3600).sensors.used).toBe(0);
    });

    it.each([
      ['first', UNITS.saltOdd, 0],
      ['second', UNITS.saltEven, 1],
    ])(
      'tells withheld sensors, every second one from the %s, within 6 K rms',
      (_, unit, parity) => {
        const all = sandiaPoints();
        const withheld = all.filter((point) => rankOf(point, all) % 2 === parity);
        let squares = 0;
        let normalised = 0;
        for (const { time_s, height_m, value_degC } of withheld) {
          const row = unit.rows.find((one) => one.time_s === time_s)!;
          expect(row.values).not.toHaveProperty(channelOf(height_m));
          const { temperature_K, sigma_K } = profileAt(unit, time_s, SALT_HEIGHT_M - height_m);
          const error = temperature_K - 273.15 - value_degC;
          squares += error ** 2;
          // The withheld reading has its own scatter: 3 K of noise and 1 K of offset, as configured.
          normalised += error ** 2 / (sigma_K ** 2 + 3 ** 2 + 1 ** 2);
        }
        const rms = Math.sqrt(squares / withheld.length);
        const ratio = Math.sqrt(normalised / withheld.length);
        console.info(
          `salt, ${withheld.length} readings withheld: rms ${rms.toFixed(2)} K, truth over sigma ${ratio.toFixed(2)}`,
        );
        expect(withheld.length).toBeGreaterThan(70);
        expect(rms).toBeLessThan(6);
        // A consistent sigma gives 1 +/- 1/sqrt(2 n) = 0.08 with independent errors; those of one
        // digitised curve are not, so four times that is asked.
        expect(Math.abs(ratio - 1)).toBeLessThan(0.32);
      },
    );

    /** Temperature and sigma of the stored profile at a place, by straight lines between cells. */
    function profileAt(unit: MeasuredUnit, time_s: number, x_m: number) {
      const profile = of(unit).stored.profiles.find((p) => Date.parse(p.time) === sourceMs(time_s));
      const { x_m: cells, tubes } = Object.values(profile!.stores)[0]!;
      const above = cells.findIndex((x) => x >= x_m);
      const i = above < 0 ? cells.length - 2 : Math.max(0, above - 1);
      const share = Math.min(1, Math.max(0, (x_m - cells[i]!) / (cells[i + 1]! - cells[i]!)));
      const between = (values: readonly number[]) =>
        values[i]! + share * (values[i + 1]! - values[i]!);
      const { temperature_K, sigma_K } = tubes[0]!;
      return { temperature_K: between(temperature_K), sigma_K: between(sigma_K) };
    }
  });

  describe('rock bed with hot air, started uniform (Meier et al. 1991)', () => {
    const TIMES = [
      [3600, 0.42, 0.2],
      [7200, 0.84, 0.34],
    ] as const;

    it.each(TIMES)('after %i s: half front at %f m with the sensors', (time_s, x, width) => {
      for (const found of bothAt(UNITS.air, time_s)) {
        console.info(
          `air, ${time_s / 3600} h with sensors: front ${found.position_m?.toFixed(3)} m (${x}), width ${found.width_m?.toFixed(3)} m (${width})`,
        );
        expect(Math.abs(found.position_m! - x)).toBeLessThan(0.06);
      }
    });

    it.each(TIMES)(
      'after %i s: says honestly what it predicts without them',
      (time_s, x, width) => {
        const [front] = storeAt(UNITS.airStart, time_s).fronts;
        const found = of(UNITS.airStart).stored.estimates.find(
          (one: Estimate) => Date.parse(one.time) === sourceMs(time_s),
        );
        // Position: the flow of 0.0034 kg/s is not metered but was fitted to the measured speed, so
        // meeting it shows the heat balance only. Width: missed, because the correlation's heat
        // transfer is that of wide beds; this tube has D/d = 7.5, gas running along its wall and a
        // steel mantle that carries heat ahead, none of which a one-dimensional bed has.
        console.info(
          `air, ${time_s / 3600} h without sensors: front ${front?.position_m?.toFixed(3)} +/- ${front?.position_sigma_m?.toFixed(3)} m (${x}), width ${front?.width_m?.toFixed(3)} m (${width}), quality ${found?.quality}`,
        );
        expect(Math.abs(front!.position_m! - x)).toBeLessThan(2 * front!.position_sigma_m!);
        // Nobody may take a prediction for a measurement.
        expect(['stale', 'blind']).toContain(found?.quality);
        expect(storeAt(UNITS.airStart, time_s).sensors.used).toBe(0);
      },
    );
  });
});
