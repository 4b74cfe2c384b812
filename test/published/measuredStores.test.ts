import { describe, expect, it } from 'vitest';
import { type MeasuredStep, runMeasured } from './measuredRun.js';
import {
  channelOf,
  heightsOf,
  type MeasuredPoint,
  meierPoints,
  meierSite,
  sandiaPoints,
  sandiaSite,
} from './measuredStores.js';

/**
 * Sources: fixtures/sandia_pacheco2002_discharge_measured.csv (Pacheco, Showalter, Kolb 2002) and
 * fixtures/meier1991_rockbed_air_charge_measured.csv (Meier, Winkler, Wuillemin 1991). Flow and
 * inlet temperature of every minute are constructed: 7.0 kg/s of salt at 290 degC; 0.0034 kg/s of
 * air at 545 degC (both flows from the fixtures' heads).
 */
const SALT_HEIGHT_M = 6.1;

/** 1-based position in its own profile, for withholding every second sensor. */
function withRank(points: readonly MeasuredPoint[]): { point: MeasuredPoint; rank: number }[] {
  return points.map((point) => ({
    point,
    rank: points
      .filter((p) => p.time_s === point.time_s)
      .sort((a, b) => a.height_m - b.height_m)
      .indexOf(point),
  }));
}

function saltRun(used: (point: MeasuredPoint, rank: number) => boolean): MeasuredStep[] {
  const points = withRank(sandiaPoints());
  const rows = Array.from({ length: 61 }, (_, minute) => {
    const values: Record<string, number> = { flow: -7, T_bottom: 290 };
    for (const { point, rank } of points) {
      if (point.time_s !== minute * 60 || !used(point, rank)) continue;
      values[channelOf(point.height_m)] = point.value_degC;
    }
    return { time_s: minute * 60, values };
  });
  return runMeasured(sandiaSite(sandiaPoints()), rows);
}

function storeAt(run: readonly MeasuredStep[], time_s: number) {
  const step = run.find((s) => s.time_s === time_s);
  const store = Object.values(step?.estimate.stores ?? {})[0];
  const view = Object.values(step?.profile.stores ?? {})[0];
  if (store === undefined || view === undefined) throw new Error(`no estimate at ${time_s} s`);
  return { store, view };
}

describe('measured salt thermocline, discharging', () => {
  const run = saltRun(() => true);
  // 343 degC crossings by straight lines between the points: CHECKS.md, measured stores.
  it.each([
    [0, 0.845, null, 2.98],
    [1800, 1.82, 0.739, 2.42],
    [3600, 2.679, 0.959, 1.86],
  ])(
    'after %i s: crossing at %f m, width %s m, heat %f MWh above 290 degC',
    (t, x, width, heat) => {
      const { store } = storeAt(run, t);
      expect(store.fronts).toHaveLength(1);
      const front = store.fronts[0];
      expect(Math.abs(SALT_HEIGHT_M - (front?.position_m ?? 0) - x)).toBeLessThan(0.1);
      // At 0 h the lowest reading is 331 degC: no 16 % crossing, so no width.
      if (width === null) expect(front?.width_m).toBeNull();
      else expect(Math.abs((front?.width_m ?? 0) - width)).toBeLessThan(0.15);
      // The published heat is that of the profile at the salt's and rock's tabulated heat capacity; ours
      // also moves with the heat capacity that flow and front tell (here +1 %), which is taken out.
      const first = storeAt(run, 0).store;
      const tabulated = store.soc * (first.stored_MWh_th / first.soc);
      expect(Math.abs(tabulated / heat - 1)).toBeLessThan(0.03);
    },
  );

  it('predicts the front at 1 h from the 0 h scan alone', () => {
    const { store } = storeAt(
      saltRun((p) => p.time_s === 0),
      3600,
    );
    const front = store.fronts[0];
    expect(Math.abs(SALT_HEIGHT_M - (front?.position_m ?? 0) - 2.679)).toBeLessThan(0.15);
    expect(store.sensors.used).toBe(0);
  });

  it.each([0, 1])('tells withheld sensors (every second one, from %i) within 6 K rms', (parity) => {
    const half = saltRun((_, rank) => rank % 2 === parity);
    let squares = 0;
    let normalised = 0;
    let count = 0;
    for (const { point, rank } of withRank(sandiaPoints())) {
      if (rank % 2 === parity) continue;
      const { view } = storeAt(half, point.time_s);
      const x = SALT_HEIGHT_M - point.height_m;
      const tube = view.tubes[0];
      const cells = view.x_m.length;
      const place = Math.min(cells - 1.001, Math.max(0, (x / SALT_HEIGHT_M) * cells - 0.5));
      const i = Math.floor(place);
      const between = (values: readonly number[]): number =>
        (values[i] as number) + (place - i) * ((values[i + 1] as number) - (values[i] as number));
      const error = between(tube?.temperature_K ?? []) - 273.15 - point.value_degC;
      // Scatter of the reading itself: 3 K noise and 1 K offset, as configured.
      const sigma = Math.hypot(between(tube?.sigma_K ?? []), 3, 1);
      squares += error ** 2;
      normalised += (error / sigma) ** 2;
      count++;
    }
    const rms = Math.sqrt(squares / count);
    const ratio = Math.sqrt(normalised / count);
    console.info(
      `withheld sensors, parity ${parity}: ${count} readings, rms ${rms.toFixed(2)} K, truth over sigma ${ratio.toFixed(2)}`,
    );
    expect(rms).toBeLessThan(6);
    // About 79 readings: a consistent sigma gives 1 +/- 0.08 with independent errors; those of one
    // figure are not, so twice that band on either side is asked.
    expect(ratio).toBeGreaterThan(0.84);
    expect(ratio).toBeLessThan(1.16);
  });
});

describe('measured rock bed, charged with hot air from uniform', () => {
  function airRun(withSensors: boolean): MeasuredStep[] {
    const points = meierPoints();
    const rows = Array.from({ length: 121 }, (_, minute) => {
      const values: Record<string, number> = { flow: 0.0034, T_in: 545 };
      if (minute === 0) for (const h of heightsOf(points)) values[channelOf(h)] = 30;
      for (const p of points) {
        if (withSensors && p.time_s === minute * 60) values[channelOf(p.height_m)] = p.value_degC;
      }
      return { time_s: minute * 60, values };
    });
    return runMeasured(meierSite(points), rows);
  }

  it.each([
    [3600, 0.42],
    [7200, 0.84],
  ])('finds the half front after %i s at %f m with the sensors', (t, x) => {
    const { store } = storeAt(airRun(true), t);
    expect(Math.abs((store.fronts[0]?.position_m ?? 0) - x)).toBeLessThan(0.06);
  });

  it('says honestly what it predicts without them', () => {
    const run = airRun(false);
    for (const [t, x, width] of [
      [3600, 0.42, 0.2],
      [7200, 0.84, 0.34],
    ] as const) {
      const front = storeAt(run, t).store.fronts[0];
      const error = (front?.position_m ?? 0) - x;
      console.info(
        `without sensors after ${t / 3600} h: front ${front?.position_m?.toFixed(3)} m (measured ${x}), width ${front?.width_m?.toFixed(3)} m (measured ${width})`,
      );
      // The flow of 0.0034 kg/s was itself fitted to the measured speed, so the position is met;
      // the width is not: the correlation's heat transfer is that of a wide bed, this tube has
      // D/d = 7.5 with channelling at the wall and a steel mantle that takes up heat.
      expect(Math.abs(error)).toBeLessThan(2 * (front?.position_sigma_m ?? 0));
    }
  });
});
