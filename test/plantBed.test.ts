import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { type Bed, type BedParameters, createBed } from './plant/bed.js';
import { DEMO_GEOMETRY } from './plant/demoGeometry.js';
import { fluidAt, type TruthFluid } from './plant/fluids.js';
import { frontsOf } from './plant/fronts.js';
import { shellConductances } from './plant/particle.js';
import { SOLIDS } from './plant/solids.js';
import { bedConductivity, pressureGradient } from './plant/transfer.js';
import { meanProfile } from './plant/tubes.js';

const CONSTANT_GAS: TruthFluid = {
  name: 'constant',
  liquid: false,
  heatCapacity: () => 1000,
  viscosity: () => 3e-5,
  conductivity: () => 0.03,
  density: () => 1,
};

function parameters(over: Partial<BedParameters>): BedParameters {
  const hot = DEMO_GEOMETRY.stores[0]!;
  return {
    ...hot,
    solid: SOLIDS.granite!,
    fluid: fluidAt('argon', hot.pressure_Pa),
    ring_shares: [1],
    cells: 200,
    shells: 3,
    heat_capacity_factor: 1,
    conductivity_factor: 1,
    stirring_factor: 1,
    wall_capacity_J_m2K: 59e3,
    end_exchange_W_K: 6e3,
    ...over,
  };
}

/** Nothing but gas, film and rock. */
const BARE = {
  conductivity_factor: 0,
  stirring_factor: 0,
  wall_loss_W_m2K: 0,
  end_loss_W_m2K: [0, 0],
  end_capacity_J_K: [0, 0],
} as const;

interface SchumannRow {
  readonly xi: number;
  readonly tau: number;
  readonly solid: number;
}

/** Exact response of a two-phase bed; source and definition in the file's header. */
function schumannTable(): SchumannRow[] {
  const text = readFileSync(
    new URL('../fixtures/schumann_analytic_J_table.csv', import.meta.url),
    'utf8',
  );
  return text
    .split('\n')
    .filter((line) => /^[0-9]/.test(line))
    .map((line) => {
      const [xi, tau, , solid] = line.split(',').map(Number);
      return { xi: xi!, tau: tau!, solid: solid! };
    });
}

/** Largest errors in theta of the rock against the table, bed of xi = 100: over all tau to 100, and at 100. */
function schumannError(cells: number): { all: number; late: number } {
  const flux = 1;
  const trial = createBed(parameters({ ...BARE, solid: SOLIDS.constant!, fluid: CONSTANT_GAS }));
  const film = trial.c.filmA.at(300) + flux ** 0.6 * trial.c.filmB.at(300);
  const length_m = (100 * flux * 1000) / film;
  const bed = createBed(
    parameters({ ...BARE, solid: SOLIDS.constant!, fluid: CONSTANT_GAS, length_m, cells }),
  );
  bed.fill(() => 300);
  const perTau = (bed.c.rockDensity * 1000) / film;
  const stepsPerTau = cells / 100;
  const rows = schumannTable().filter((row) => row.tau <= 100 && row.xi <= 90);
  expect(rows.length).toBeGreaterThan(100);
  let worst = 0;
  let late = 0;
  for (let n = 1; n <= 100 * stepsPerTau; n++) {
    bed.step(perTau / stepsPerTau, flux * bed.c.area_m2, 301, 300);
    for (const row of rows) {
      if (Math.abs(row.tau - n / stepsPerTau) > 1e-9) continue;
      const at = (row.xi * cells) / 100 - 0.5;
      if (at < 0) continue;
      const i = Math.floor(at);
      const T = bed.mean[i]! + (at - i) * (bed.mean[i + 1]! - bed.mean[i]!);
      worst = Math.max(worst, Math.abs(T - 300 - row.solid));
      if (row.tau === 100) late = Math.max(late, Math.abs(T - 300 - row.solid));
    }
  }
  return { all: worst, late };
}

describe("the finer plant's bed", () => {
  it('meets the exact two-phase response, with an error of second order', () => {
    const coarse = schumannError(200);
    const fine = schumannError(400);
    // Straight lines between centres and the box scheme are of second order: halving gives a quarter.
    expect(fine.all).toBeLessThan(coarse.all / 3);
    // Asked of the estimator's own bed too: below 0.002 in theta at 200 cells and tau 100.
    expect(coarse.late).toBeLessThan(0.002);
    expect(coarse.late).toBeGreaterThan(0);
  });

  it.each([
    ['argon', fluidAt('argon', 7.9e5), SOLIDS.granite!],
    ['salt', fluidAt('salt', 1e5), SOLIDS.quartzite!],
  ])('keeps its energy over 10,000 steps with %s, reversals and rests', (_, fluid, solid) => {
    const bed = createBed(
      parameters({ fluid, solid, cells: 60, ring_shares: [0.5, 0.3, 0.2], length_m: 5 }),
    );
    bed.ringFlow.set([1.05, 1, 0.875]);
    bed.fill((x) => 600 - 30 * x);
    const start = bed.totalHeat_J();
    for (let n = 0; n < 10000; n++) {
      const phase = Math.floor(n / 700) % 3;
      const flow = phase === 0 ? 12 : phase === 1 ? 0 : -9;
      bed.step(20, flow, phase === 0 ? 700 : 320, 285);
    }
    const gap = bed.totalHeat_J() - start - bed.gasHeat_J + bed.lostHeat_J;
    expect(Math.abs(bed.lostHeat_J)).toBeGreaterThan(1e-4 * bed.capacityBetween_J(320, 700));
    expect(Math.abs(gap)).toBeLessThan(1e-9 * bed.capacityBetween_J(320, 700));
  });

  it('converges with cells and steps: at 400 cells and 20 s within 5 mm of the limit', () => {
    const [coarse, middle, fine] = [100, 200, 400].map((cells) => {
      const bed = createBed(parameters({ cells }));
      charge(bed, 5 * 3600, 8000 / cells);
      return frontOf(bed);
    });
    const position = [
      coarse!.position_m - middle!.position_m,
      middle!.position_m - fine!.position_m,
    ];
    const width = [coarse!.width_m! - middle!.width_m!, middle!.width_m! - fine!.width_m!];
    // Second order: what is left after the last halving is a third of the last difference.
    expect(Math.abs(position[1]! / 3)).toBeLessThan(0.005);
    expect(Math.abs(width[1]! / 3)).toBeLessThan(0.005);
    expect(Math.abs(position[1]!)).toBeLessThan(Math.abs(position[0]!) / 2 + 1e-4);
    expect(Math.abs(width[1]!)).toBeLessThan(Math.abs(width[0]!) / 2 + 1e-4);
  });

  it('moves a liquid front with the heat capacity of rock and fluid together', () => {
    const fluid = fluidAt('salt', 1e5);
    const bed = createBed(
      parameters({
        ...BARE,
        solid: SOLIDS.quartzite!,
        fluid,
        void_fraction: 0.22,
        length_m: 6,
        diameter_m: 3,
        particle_diameter_m: 0.015,
        cells: 300,
      }),
    );
    bed.fill(() => 563);
    for (let n = 0; n < 360; n++) bed.step(20, 7, 669, 563);
    // Plug flow of Pacheco's thermocline (2002): 2.773e6 J/m3K at 7.0 kg/s gives 1.944 m/h.
    const front = frontsOf(bed.mean, bed.c.cellLength_m, 563, 669)[0]!;
    // Shape moves the 0.5 crossing by half a transfer length, under 2 cm here.
    expect(Math.abs(front.position_m - 2 * 1.944)).toBeLessThan(0.02);
  });

  it('loses heat at the rate of its coefficients once wall and lids are in balance', () => {
    const bed = createBed(parameters({ cells: 60, ring_shares: [0.5, 0.3, 0.2] }));
    bed.fill(() => 600);
    for (let n = 0; n < 4000; n++) bed.step(60, 0, 300, 300);
    const before = bed.lostHeat_J;
    let mantle = 0;
    for (let i = 0; i < 60; i++)
      mantle += (bed.wall[i]! - 300) * Math.PI * bed.p.diameter_m * bed.c.cellLength_m;
    const lids = [0, 1].map((e) => bed.p.end_loss_W_m2K[e]! * bed.c.area_m2 * (bed.ends[e]! - 300));
    bed.step(60, 0, 300, 300);
    const expected = bed.p.wall_loss_W_m2K * mantle + lids[0]! + lids[1]!;
    // The wall cools by less than a part in ten thousand in a minute.
    expect((bed.lostHeat_J - before) / 60 / expected).toBeCloseTo(1, 3);
  });
});

function charge(bed: Bed, seconds: number, dt: number): void {
  bed.fill(() => 298);
  for (let n = 0; n < seconds / dt; n++) bed.step(dt, 18, 733, 288);
}

function frontOf(bed: Bed) {
  const rings = bed.p.ring_shares.map((_, r) => r);
  return frontsOf(meanProfile(bed, rings), bed.c.cellLength_m, 298, 733)[0]!;
}

describe('the particles of the finer plant', () => {
  it.each([1, 2, 3, 6])(
    'lag their surface by q R/(5 k) when warmed steadily, cut into %i shells',
    (shells) => {
      const R = 0.01;
      const volume = (4 / 3) * Math.PI * R ** 3;
      const { between, surface } = shellConductances(2 * R, shells);
      // Steady warming: the heat through shell boundary s is that of the shells within, P s/S.
      const power = 1;
      let T = -power / surface;
      let mean = T / shells;
      for (let s = shells - 2; s >= 0; s--) {
        T -= (power * (s + 1)) / shells / between[s]!;
        mean += T / shells;
      }
      // q is the flux at the surface; volume/(area) = R/3.
      const flux = power / ((3 * volume) / R);
      expect(-mean).toBeCloseTo((flux * R) / 5, 9);
    },
  );
});

describe("the finer plant's transfer laws", () => {
  it('give the hand case of air at 773.15 K, d 20 mm, eps 0.40, G 0.225 kg/m2s', () => {
    const air = fluidAt('air', 101325);
    const bed = createBed(
      parameters({ fluid: air, void_fraction: 0.4, particle_diameter_m: 0.02 }),
    );
    const hv = bed.c.filmA.at(773.15) + 0.225 ** 0.6 * bed.c.filmB.at(773.15);
    // Wakao & Kaguei; the fits of mu and k are good to 0.2 %.
    expect(hv / 9877).toBeCloseTo(1, 2);
    expect(pressureGradient(0.225, 0.4564, 3.653e-5, 0.02, 0.4)).toBeCloseTo(128.98, 1);
  });

  it.each([
    ['crushed', 300, 0.341],
    ['crushed', 573, 0.87],
    ['crushed', 773, 1.409],
    ['crushed', 873, 1.69],
    ['sphere', 300, 0.34],
    ['sphere', 573, 0.884],
  ] as const)(
    'give the published conductivity of a bed of %s pieces at %i K',
    (shape, T, expected) => {
      const air = fluidAt('air', 101325);
      const k = bedConductivity(T, air.conductivity(T), 2.5, 0.02, 0.4, 0.85, shape);
      // Three published figures, and 0.2 % of k_f.
      expect(Math.abs(k - expected)).toBeLessThan(0.004);
    },
  );

  it.each([
    [113.15, 538.0, 4.37215],
    [200, 523.685, 2.44128],
    [300, 521.538, 1.62376],
  ])(
    'give argon its heat capacity and density at 1 atm and %d K (CoolProp 8.0.0)',
    (T, cp, rho) => {
      const argon = fluidAt('argon', 101325);
      // Tsonopoulos' coefficient is good to some parts in ten thousand here.
      expect(argon.heatCapacity(T) / cp).toBeCloseTo(1, 3);
      expect(argon.density(T) / rho).toBeCloseTo(1, 3);
    },
  );

  it('give granite and basalt their published heat capacities', () => {
    expect(SOLIDS.granite!.heatCapacity(573)).toBeCloseTo(1017, -0.5);
    expect(SOLIDS.granite!.heatCapacity(773)).toBeCloseTo(1119, -0.5);
    expect(SOLIDS.basalt!.heatCapacity(373)).toBeCloseTo(851, -0.5);
    // Heat capacity of rock about halves towards -150 degC.
    const ratio = SOLIDS.basalt!.heatCapacity(123) / SOLIDS.basalt!.heatCapacity(298);
    expect(ratio).toBeGreaterThan(0.4);
    expect(ratio).toBeLessThan(0.55);
  });
});
