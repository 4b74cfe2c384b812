import { type BedStep, type BedWork, createBedWork, stepBed } from '../bed/kernel.js';
import { type BedTables, enthalpyAt, temperatureAt } from '../bed/tables.js';
import type { StoreModel } from '../track/storeTracker.js';
import { conductAcross } from './across.js';
import type { TuneBin } from './record.js';
import { placeOf, type Rings } from './rings.js';

/** What a store's run depends on, as departures from the configuration; all 0 there. */
export interface StoreGuess {
  /** ln of heat transfer, bed conductivity and losses over those configured. */
  readonly transfer: number;
  readonly conductivity: number;
  readonly loss: number;
  /** Offset of the gas temperature at the charge and at the discharge inlet [K]. */
  readonly chargeInlet_K: number;
  readonly dischargeInlet_K: number;
  /** Change of ln(true/metered flow) from the mean flow to twice that. */
  readonly meterSlope: number;
  /** Share of the gas that the junctions see [-], and how late their thermowells let them [s]. */
  readonly share: number;
  readonly lag_s: number;
  /** ln of the wall's heat capacity over that configured. */
  readonly wallSteel: number;
}

/** Of one string's rings: ln(true/metered flow), own departures, profile at the start [K, by cell]. */
export interface StringGuess {
  readonly flow: number;
  readonly transfer: number;
  readonly conductivity: number;
  readonly start_K: Float64Array;
}

/**
 * What the thermocouples of a string should read without errors of their own, in every bin at the
 * mean time of its readings; arrays are bins x sensors, row-major.
 */
export interface StringRun {
  /** T - lag dT/dt [K] with the rock's T at x - share l, l the signed gas-to-rock lag G cf/hv. */
  readonly value: Float64Array;
  /** The slope of T along x [K/m], the lag l there [m], 0 while standing, and dT/dt [K/s]. */
  readonly slope: Float64Array;
  readonly lag: Float64Array;
  readonly rate: Float64Array;
}

/** What never changes between runs of a store. */
export interface RunPlan {
  readonly store: StoreModel;
  readonly rings: Rings;
  readonly bins: readonly TuneBin[];
  /** Index of the store in the bins. */
  readonly s: number;
  /** Mean of |flow| while flowing, to which the meter's slope refers [kg/s]. */
  readonly meanFlow_kg_s: number;
  /** Positions of the thermocouples [m], by string. */
  readonly positions_m: readonly (readonly number[])[];
}

interface Ring {
  readonly tables: BedTables;
  readonly own: StringGuess;
  readonly work: BedWork;
  readonly enthalpy: Float64Array;
  readonly now: Float64Array;
  readonly before: Float64Array;
}

/**
 * Runs a store through a recording, open loop: metered flow and measured inlet gas in, readings out.
 *
 * @param strings one guess per string; the cells are those of their starting profiles
 */
export function runStore(
  plan: RunPlan,
  guess: StoreGuess,
  strings: readonly StringGuess[],
): StringRun[] {
  const { store, rings, bins, s } = plan;
  const { bed } = store.store;
  const loss_factor = bed.loss_factor * Math.exp(guess.loss);
  const tables = strings.map((own): BedTables => {
    const k = Math.exp(guess.conductivity + own.conductivity);
    return {
      ...store.tables,
      bed: { ...bed, loss_factor },
      stagnant: store.tables.stagnant.map((value) => value * k),
    };
  });
  const ring = Array.from(rings.string, (k): Ring => {
    const own = strings[k] as StringGuess;
    const table = tables[k] as BedTables;
    return {
      tables: table,
      own,
      work: createBedWork(own.start_K.length),
      enthalpy: own.start_K.map((t) => enthalpyAt(table, t)),
      now: own.start_K.slice(),
      before: own.start_K.slice(),
    };
  });
  const ringTables = ring.map((one) => one.tables);
  const enthalpies = ring.map((one) => one.enthalpy);
  const temperatures = ring.map((one) => one.now);
  const steel_K = (ring[ring.length - 1] as Ring).now.slice();
  const runs = plan.positions_m.map((row): StringRun => {
    const size = bins.length * row.length;
    return {
      value: new Float64Array(size),
      slope: new Float64Array(size),
      lag: new Float64Array(size),
      rate: new Float64Array(size),
    };
  });
  bins.forEach((bin, b) => {
    const load = Math.abs(bin.flow_kg_s) / plan.meanFlow_kg_s - 1;
    const flux = (bin.flow_kg_s / bed.area_m2) * Math.exp(guess.meterSlope * load);
    const offset = bin.flow_kg_s >= 0 ? guess.chargeInlet_K : guess.dischargeInlet_K;
    for (const one of ring) {
      const step: BedStep = {
        massFlux_kg_m2s: bin.flow_kg_s === 0 ? 0 : flux * Math.exp(one.own.flow),
        inlet_K: (bin.inlet_K[s] as number) + offset,
        ambient_K: bin.ambient_K,
        dt_s: bin.dt_s,
        heatTransferFactor: Math.exp(guess.transfer + one.own.transfer),
        wallLoss_W_m3K: 0,
      };
      one.before.set(one.now);
      stepBed(one.tables, one.enthalpy, step, one.work);
      toTemperatures(one);
    }
    conductAcross(rings, ringTables, enthalpies, temperatures, steel_K, {
      steel_J_m2K: (bed.wall_capacity_J_m2K ?? 0) * Math.exp(guess.wallSteel),
      loss_W_m2K: bed.wall_loss_W_m2K * loss_factor,
      ambient_K: bin.ambient_K,
      massFlux_kg_m2s: Math.abs(flux),
      dt_s: bin.dt_s,
    });
    for (const one of ring) toTemperatures(one);
    runs.forEach((run, k) => {
      read(plan, ring, k, b, guess, run);
    });
  });
  return runs;
}

function toTemperatures(one: Ring): void {
  for (let i = 0; i < one.now.length; i++) {
    one.now[i] = temperatureAt(one.tables, one.enthalpy[i] as number);
  }
}

/** Readings of one string in one bin, between its two rings and the bin's two ends. */
function read(
  plan: RunPlan,
  ring: readonly Ring[],
  k: number,
  b: number,
  guess: StoreGuess,
  run: StringRun,
): void {
  const { rings, store, bins } = plan;
  const bin = bins[b] as TuneBin;
  const positions = plan.positions_m[k] as readonly number[];
  const between = placeOf(rings, k);
  const sides = [
    { ring: ring[between.inner] as Ring, weight: 1 - between.weight },
    { ring: ring[between.outer] as Ring, weight: between.weight },
  ];
  const dx = store.store.bed.length_m / (sides[0] as { ring: Ring }).ring.now.length;
  const sign = Math.sign(bin.flow_kg_s);
  positions.forEach((x, j) => {
    const at = b * positions.length + j;
    let value = 0;
    let slope = 0;
    let lag = 0;
    let rate = 0;
    for (const side of sides) {
      if (side.weight === 0) continue;
      const own = sign * lagAt(side.ring.work, x / dx);
      const place = (x - guess.share * own) / dx - 0.5;
      sample(side.ring.before, place, SAMPLE);
      rate -= (side.weight * SAMPLE.value) / bin.dt_s;
      value += side.weight * (1 - bin.middle) * SAMPLE.value;
      slope += (side.weight * (1 - bin.middle) * SAMPLE.slope) / dx;
      sample(side.ring.now, place, SAMPLE);
      rate += (side.weight * SAMPLE.value) / bin.dt_s;
      value += side.weight * bin.middle * SAMPLE.value;
      slope += (side.weight * bin.middle * SAMPLE.slope) / dx;
      lag += side.weight * own;
    }
    run.value[at] = value - guess.lag_s * rate;
    run.slope[at] = slope;
    run.lag[at] = lag;
    run.rate[at] = rate;
  });
}

function lagAt(work: BedWork, place: number): number {
  const i = Math.min(work.cells - 1, Math.max(0, Math.floor(place)));
  return work.gasLag_m[i] as number;
}

interface Sample {
  value: number;
  slope: number;
}
const SAMPLE: Sample = { value: 0, slope: 0 };

/**
 * Value and slope per cell at a place in cells (0 = the first centre): the cubic through four
 * centres, whose error against a front of 4 cells' width is below 0.1 % of its height; beyond the
 * outermost centres the end value.
 */
function sample(profile: Float64Array, place: number, out: Sample): void {
  const last = profile.length - 1;
  if (place <= 0 || place >= last) {
    out.value = profile[place <= 0 ? 0 : last] as number;
    out.slope = 0;
    return;
  }
  const i = Math.min(last - 2, Math.max(1, Math.floor(place)));
  const u = place - i;
  const a = profile[i - 1] as number;
  const b = profile[i] as number;
  const c = profile[i + 1] as number;
  const d = profile[i + 2] as number;
  // Lagrange at nodes -1, 0, 1, 2, as a polynomial in u.
  const c1 = c - b / 2 - a / 3 - d / 6;
  const c2 = (a + c) / 2 - b;
  const c3 = (d - a) / 6 + (b - c) / 2;
  out.value = b + u * (c1 + u * (c2 + u * c3));
  out.slope = c1 + u * (2 * c2 + 3 * u * c3);
}
