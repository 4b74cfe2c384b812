import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { loadSite } from '../src/config/load.js';
import type { BedDefinition, Fluid, Solid, UnitDefinition } from '../src/core/definitions.js';
import { bedProperties } from '../src/plant/bedProperties.js';
import { CELLS, fillBed, type PlantBed } from '../src/plant/bedState.js';
import { createDemoPlant, type DemoPlant } from '../src/plant/demoPlant.js';
import { stepBed, totalHeat_J } from '../src/plant/plantBed.js';
import { createBed } from './plant/bed.js';
import { fluidAt } from './plant/fluids.js';
import { frontsOf } from './plant/fronts.js';

const unit = loadSite(new URL('../config/demo.yaml', import.meta.url).pathname).units[0]!;

function plantBedOf(bed: BedDefinition, shares: readonly number[]): PlantBed {
  const cells = shares.length * CELLS;
  return {
    bed,
    properties: bedProperties(bed),
    areaShares: shares,
    flowShares: shares,
    heat: new Float64Array(cells),
    rock_K: new Float64Array(cells),
    gas_K: new Float64Array(cells),
    ends_K: new Float64Array(2),
    transferFactor: 1,
    gasHeat_J: 0,
    lostHeat_J: 0,
  };
}

const CONSTANT_GAS: Fluid = {
  name: 'constant',
  source: 'none',
  phase: 'gas',
  range_K: [100, 1000],
  gasConstant_J_kgK: 287,
  heatCapacity: () => 1000,
  enthalpy: (T) => 1000 * T,
  viscosity_Pa_s: () => 3e-5,
  conductivity: () => 0.03,
  density_kg_m3: () => 1,
};
const CONSTANT_ROCK: Solid = {
  name: 'constant',
  source: 'none',
  range_K: [100, 1000],
  density_kg_m3: 2500,
  heatCapacity: () => 1000,
  enthalpy: (T) => 1000 * T,
  conductivity: () => 1e9,
  emissivity: 0.9,
};

describe("the demonstration plant's bed", () => {
  it('meets the exact two-phase response', () => {
    const hot = unit.stores[0]!.bed;
    // Grains of 0.1 mm: stirring 0.5 G d cf then adds 0.5 d hv/(G cf) = 0.04 % to the spreading.
    const fine = { ...hot, particle_diameter_m: 1e-4, solid: CONSTANT_ROCK, fluid: CONSTANT_GAS };
    const bare = {
      ...fine,
      conductivity_factor: 0,
      wall_loss_W_m2K: 0,
      end_loss_W_m2K: { charge_inlet: 0, discharge_inlet: 0 },
      end_capacity_J_K: { charge_inlet: 0, discharge_inlet: 0 },
    };
    // A bed of xi = 80 at G = 1 kg/m2s.
    const wanted = (80 * 1000) / hot.length_m;
    const bed = plantBedOf(
      {
        ...bare,
        heat_transfer_factor:
          wanted / bedProperties({ ...bare, heat_transfer_factor: 1 }).transfer(300, 1),
      },
      [1],
    );
    fillBed(bed, () => 300);
    const perTau = ((1 - hot.void_fraction) * 2500 * 1000) / wanted;
    const rows = readFileSync(
      new URL('../fixtures/schumann_analytic_J_table.csv', import.meta.url),
      'utf8',
    )
      .split('\n')
      .filter((line) => /^[0-9]/.test(line))
      .map((line) => line.split(',').map(Number) as [number, number, number, number])
      .filter(([xi, tau]) => tau >= 8 && tau <= 60 && xi >= 4 && xi <= 60);
    let compared = 0;
    let worst = 0;
    for (let n = 1; n <= 60 * 5; n++) {
      stepBed(bed, perTau / 5, hot.area_m2, 301, 300);
      for (const [xi, tau, , solid] of rows) {
        if (Math.abs(tau - n / 5) > 1e-9) continue;
        const at = (xi * CELLS) / 80 - 0.5;
        const i = Math.floor(at);
        const T = bed.rock_K[i]! + (at - i) * (bed.rock_K[i + 1]! - bed.rock_K[i]!);
        worst = Math.max(worst, Math.abs(T - 300 - solid));
        compared++;
      }
    }
    expect(compared).toBeGreaterThan(30);
    // Cells of half a transfer unit and theta'' of at most 0.242/(2 tau): straight lines between centres
    // leave 0.5^2/8 of it, and the limited slopes and Heun's rule each as much again.
    expect(worst).toBeLessThan((3 * 0.25 * 0.242) / 8 / 16);
  });

  it('keeps its energy over reversals and rests', () => {
    const bed = plantBedOf(unit.stores[0]!.bed, [0.2, 0.3, 0.5]);
    fillBed(bed, (x) => 700 - 30 * x);
    const start = totalHeat_J(bed);
    for (let n = 0; n < 3000; n++) {
      const phase = Math.floor(n / 250) % 3;
      const flow = phase === 0 ? 15 : phase === 1 ? 0 : -12;
      stepBed(bed, 15, flow, phase === 0 ? 730 : 305, 285);
    }
    const { heatAt } = bed.properties;
    const capacity = (heatAt(733) - heatAt(298)) * bed.bed.area_m2 * bed.bed.length_m;
    const gap = totalHeat_J(bed) - start - bed.gasHeat_J + bed.lostHeat_J;
    expect(bed.lostHeat_J / capacity).toBeGreaterThan(1e-3);
    expect(Math.abs(gap) / capacity).toBeLessThan(1e-9);
  });

  it.each(['hot', 'cold'] as const)(
    'agrees with the finer plant on a clean charge of the %s store',
    (kind) => {
      const store = unit.stores.find((s) => s.kind === kind)!;
      const { bed, reference_hot_K: hot, reference_cold_K: cold } = store;
      const [inlet, start] = kind === 'hot' ? [hot, cold] : [cold, hot];
      const tight = {
        ...bed,
        wall_loss_W_m2K: 0,
        end_loss_W_m2K: { charge_inlet: 0, discharge_inlet: 0 },
        end_capacity_J_K: { charge_inlet: 0, discharge_inlet: 0 },
      };
      const coarse = plantBedOf(tight, [1]);
      fillBed(coarse, () => start);
      const fine = createBed({
        ...tight,
        solid: bed.solid,
        fluid: fluidAt('argon', bed.pressure_Pa),
        ring_shares: [1],
        cells: 400,
        shells: 3,
        stirring_factor: 1,
        end_loss_W_m2K: [0, 0],
        end_capacity_J_K: [0, 0],
        wall_capacity_J_m2K: 59e3,
        end_exchange_W_K: 6e3,
      });
      fine.fill(() => start);
      const hours = 5;
      for (let n = 0; n < hours * 240; n++) stepBed(coarse, 15, 17, inlet, start);
      for (let n = 0; n < hours * 180; n++) fine.step(20, 17, inlet, start);
      const a = frontsOf(coarse.rock_K, bed.length_m / CELLS, cold, hot)[0]!;
      const b = frontsOf(fine.mean, fine.c.cellLength_m, cold, hot)[0]!;
      // Two virial forms differ by up to 0.1 % of cp; cells of 58 mm place a crossing to a tenth of a cell.
      // What the finer plant's wall takes up it takes behind the front, where it shifts no crossing.
      const tolerance_m = 0.001 * b.position_m + 0.1 * (bed.length_m / CELLS);
      expect(Math.abs(a.position_m - b.position_m)).toBeLessThan(tolerance_m);
      // Widths: second-order spreading of the coarser, its (dx/width)^2, and the grains' inner lag.
      const dx = bed.length_m / CELLS;
      expect(Math.abs(a.width_m! / b.width_m! - 1)).toBeLessThan((dx / b.width_m!) ** 2 + 0.01);
    },
  );
});

/** Runs until a condition holds; fails after so many plant hours. */
function runUntil(plant: DemoPlant, hours: number, done: () => boolean): void {
  for (let n = 0; n < (hours * 3600) / unit.scan_period_s; n++) {
    plant.step();
    if (done()) return;
  }
  throw new Error(`not reached within ${hours} plant hours`);
}

/** Runs a plant that discharges at rated power for an hour, by which its true hours become fewer. */
function knowsItsHours(plant: DemoPlant): void {
  const hours = plant.hoursTruth(unit.rated_power_W);
  expect(plant.truth().mode).toBe('discharge');
  for (let n = 0; n < 3600 / unit.scan_period_s; n++) plant.step();
  // An hour later at the same power an hour less is left; both are counted in half minutes.
  expect(hours - plant.hoursTruth(unit.rated_power_W)).toBeCloseTo(1, 1.6);
  expect(plant.hoursTruth(0.6 * unit.rated_power_W)).toBeGreaterThan(hours - 1);
  expect(() => plant.hoursTruth(0)).toThrow(RangeError);
}

describe('the demonstration plant', () => {
  it('gives every channel of its unit a finite reading, on time', () => {
    const plant = createDemoPlant(unit, { start_ms: 1_000_000_010 });
    const start = plant.time_ms;
    expect(start % (unit.scan_period_s * 1000)).toBe(0);
    for (let n = 1; n <= 20; n++) {
      const { time_ms, values } = plant.step();
      expect(time_ms).toBe(start + n * unit.scan_period_s * 1000);
      expect(plant.time_ms).toBe(time_ms);
      expect(Object.keys(values).sort()).toEqual(unit.channels.map((c) => c.id).sort());
      for (const value of Object.values(values)) expect(value).toSatisfy(Number.isFinite);
    }
  });

  it('gives the same readings for the same seed and others for another', () => {
    const run = (seed: number) => {
      const plant = createDemoPlant(unit, { seed });
      return Array.from({ length: 30 }, () => plant.step());
    };
    expect(run(3)).toEqual(run(3));
    expect(run(4).at(-1)!.values.hot_axis_01).not.toBe(run(3).at(-1)!.values.hot_axis_01);
  });

  it('charges, stands and discharges in turn; dust spreads a front on its second cycle and a thermocouple sticks on its third; true hours are as long as a discharge at that power lasts', () => {
    const plant = createDemoPlant(unit);
    const modes: string[] = [];
    let dusty = plant.truth();
    runUntil(plant, 60, () => {
      const truth = plant.truth();
      const { mode, flow_kg_s, power_W, cycle } = truth;
      if (modes.at(-1) !== mode) modes.push(mode);
      if (mode === 'charge') expect(Math.min(flow_kg_s, power_W)).toBeGreaterThan(0);
      if (mode === 'discharge') expect(Math.max(flow_kg_s, power_W)).toBeLessThan(0);
      if (mode === 'stand') expect(flow_kg_s).toBe(0);
      if (cycle === 0) expect(truth.incidents).toEqual([]);
      // The end of the second charge.
      if (cycle === 1 && mode === 'charge') dusty = truth;
      return truth.incidents.length === 2;
    });
    const turn = ['charge', 'stand', 'discharge', 'stand'];
    expect(modes.slice(0, 9)).toEqual([...turn, ...turn, 'charge']);

    const clean = createDemoPlant(unit, { incidents: false });
    runUntil(clean, 20, () => clean.truth().mode === 'discharge');
    knowsItsHours(clean);
    while (clean.time_ms < dusty.time_ms) clean.step();
    const sound = clean.truth().stores.cold!;
    expect(sound.heat_transfer_factor).toBeGreaterThan(0.85);
    expect(dusty.stores.cold!.heat_transfer_factor).toBeCloseTo(0.15, 9);
    const ratio = dusty.stores.cold!.width_m! / sound.width_m!;
    expect(ratio).toBeGreaterThan(1.2 * unit.watch.spread_ratio.limit);

    const id = /thermocouple (\S+) sticks/.exec(plant.truth().incidents[1]!)![1]!;
    const readings = Array.from({ length: 360 }, () => plant.step().values);
    const first = readings[0]![id];
    expect(readings.every((values) => values[id] === first)).toBe(true);
    const neighbour = id.replace(/\d+$/, (n) => String(Number(n) - 1).padStart(n.length, '0'));
    const moved = Number(readings.at(-1)![neighbour]) - Number(readings[0]![neighbour]);
    expect(Math.abs(moved)).toBeGreaterThan(5);
    // Two plants over thirty plant hours each: seconds of computing, more on a busy machine.
  }, 120_000);

  it('leaves a channel out that reports by exception and has not moved', () => {
    const quiet: UnitDefinition = {
      ...unit,
      channels: unit.channels.map((c) =>
        c.id === 'ambient'
          ? { ...c, reporting: { kind: 'by_exception', deadband: 2, longest_silence_s: 600 } }
          : c,
      ),
    };
    const plant = createDemoPlant(quiet);
    const seen = Array.from({ length: 100 }, () => 'ambient' in plant.step().values);
    // 100 scans of 30 s: the first, then one every 20 scans of silence.
    expect(seen.filter(Boolean).length).toBeGreaterThanOrEqual(5);
    expect(seen.filter(Boolean).length).toBeLessThanOrEqual(8);
  });

  it('says which channel it cannot give', () => {
    const volts: UnitDefinition = {
      ...unit,
      channels: unit.channels.map((c) => (c.id === 'ambient' ? { ...c, raw_unit: 'mV' } : c)),
    };
    expect(() => createDemoPlant(volts)).toThrow(/channel ambient.*mV/);
  });
});
