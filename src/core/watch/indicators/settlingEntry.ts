import { createBedWork, stepBed } from '../../bed/kernel.js';
import { temperatureAt } from '../../bed/tables.js';
import type { StoreModel, StoreState } from '../../track/storeTracker.js';
import type { TubeModel, TubeState } from '../../track/tube.js';

/** A thermowell of up to 180 s has come within a tenth after so long; readings are averaged to the end [s]. */
const FROM_S = 420;
const TO_S = 600;
/** Readings before the gas enters fade with this time [s]. */
const FADE_S = 300;
/** The gas must have leapt by this, or its leap tells nothing [K]. */
const LEAP_K = 6;
/** Sigma of a mean with noise and drift [K], and of the model's share of warming. */
const NOISE_K = 0.4;
const MODEL_SHARE = 0.12;
/** A junction sees any share of the gas, 0.5 +/- 0.29. */
const GAS_SHARE = 0.5;
const GAS_SHARE_SIGMA = 0.29;
/** Share of the gas's leap that an uncovered junction shows by then: 0.9 to 1. */
export const UNCOVERED = 0.95;

/** Where a tested thermocouple hangs. */
export interface Place {
  readonly tube: number;
  readonly sensor: number;
}

/** Gas that enters at the top, from its first scan on. Plain. */
export interface Entry {
  /** Means before it entered [K]; NaN before the first reading. */
  gas_K: number;
  readonly read_K: number[];
  /** Time since it entered [s]; 0 while it does not. */
  since_s: number;
  scans: number;
  gasSum_K: number;
  readonly readSum_K: number[];
  readonly readCount: number[];
  /** Tubes moved on by the model alone since then, and their rock at the places at first [K]. */
  beds: Float64Array[] | null;
  rock_K: number[];
}

export function startEntry(places: readonly Place[]): Entry {
  return {
    gas_K: Number.NaN,
    read_K: places.map(() => Number.NaN),
    since_s: 0,
    scans: 0,
    gasSum_K: 0,
    readSum_K: places.map(() => 0),
    readCount: places.map(() => 0),
    beds: null,
    rock_K: [],
  };
}

export interface EntryScan {
  /** Gas above the bed, and readings at the places [K]; NaN = none. */
  readonly gas_K: number;
  readonly read_K: readonly number[];
  /** Metered, + = charge [kg/m2s], where it enters at the top; 0 where it does not. */
  readonly massFlux_kg_m2s: number;
  readonly ambient_K: number;
  readonly dt_s: number;
}

/** Share of the gas's leap that a place shows, and what rock shows of it there, with its sigma. */
export interface Leap {
  readonly value: number;
  readonly sigma: number;
  readonly covered: number;
}

/**
 * How quickly readings follow gas that begins to enter at the top at another temperature: a junction
 * in gas is there within its thermowell's lag, rock a decimetre down takes a quarter of an hour, as the
 * bed model alone has it. Where a junction sees part of the gas, that part counts to rock with it.
 *
 * @param entry changed in place
 * @returns ten minutes after the gas began to enter, a value for each place; null for one that cannot
 *   be told; else an empty list
 */
export function followEntry(
  entry: Entry,
  model: StoreModel,
  state: StoreState,
  places: readonly Place[],
  scan: EntryScan,
): (Leap | null)[] {
  if (scan.massFlux_kg_m2s === 0) {
    calm(entry, scan);
    return [];
  }
  if (entry.since_s >= TO_S) return [];
  if (entry.beds === null) {
    entry.beds = state.tubes.map(({ enthalpy }) => enthalpy.slice());
    entry.rock_K = places.map((place) => rockOf(model, entry.beds as Float64Array[], place));
  }
  entry.since_s += scan.dt_s;
  const lags = march(entry.beds, model, state, scan);
  if (entry.since_s > FROM_S && Number.isFinite(scan.gas_K)) {
    entry.scans++;
    entry.gasSum_K += scan.gas_K;
    scan.read_K.forEach((read, i) => {
      if (!Number.isFinite(read)) return;
      entry.readSum_K[i] = (entry.readSum_K[i] as number) + read;
      entry.readCount[i] = (entry.readCount[i] as number) + 1;
    });
  }
  if (entry.since_s < TO_S || entry.scans === 0) return [];
  return places.map((place, i) => leapAt(entry, model, place, i, lags[place.tube] as Float64Array));
}

function calm(entry: Entry, { gas_K, read_K, dt_s }: EntryScan): void {
  const keep = Math.exp(-dt_s / FADE_S);
  const towards = (was: number, now: number): number =>
    Number.isNaN(was) ? now : Number.isFinite(now) ? now + (was - now) * keep : was;
  entry.gas_K = towards(entry.gas_K, gas_K);
  read_K.forEach((now, i) => {
    entry.read_K[i] = towards(entry.read_K[i] as number, now);
  });
  if (entry.since_s === 0 && entry.beds === null) return;
  entry.since_s = 0;
  entry.scans = 0;
  entry.gasSum_K = 0;
  entry.readSum_K.fill(0);
  entry.readCount.fill(0);
  entry.beds = null;
  entry.rock_K = [];
}

/** Moves the tubes on by the model; the gas-to-rock lag of their cells [m]. */
function march(
  beds: readonly Float64Array[],
  { tubes, tables }: StoreModel,
  state: StoreState,
  { gas_K, massFlux_kg_m2s, ambient_K, dt_s }: EntryScan,
): Float64Array[] {
  return tubes.map((tube, k) => {
    const bed = beds[k] as Float64Array;
    const { further } = state.tubes[k] as TubeState;
    const at = (index: number): number => further[index - tube.layout.cells] as number;
    const work = createBedWork(bed.length);
    if (!Number.isFinite(gas_K) || dt_s <= 0) return work.gasLag_m;
    const step = {
      massFlux_kg_m2s: massFlux_kg_m2s * Math.exp(at(tube.layout.flow)),
      inlet_K: gas_K,
      ambient_K,
      dt_s,
      heatTransferFactor: Math.exp(at(tube.layout.transfer)),
      wallLoss_W_m3K: tube.wallLoss_W_m3K,
    };
    stepBed(tables, bed, step, work);
    return work.gasLag_m;
  });
}

const cellOf = ({ layout, string }: TubeModel, length_m: number, sensor: number): number => {
  const x = string.thermocouples[sensor]?.position_m ?? 0;
  return Math.min(layout.cells - 1, Math.max(0, Math.floor((x / length_m) * layout.cells)));
};

function rockOf(model: StoreModel, beds: readonly Float64Array[], place: Place): number {
  const tube = model.tubes[place.tube] as TubeModel;
  const cell = cellOf(tube, model.store.bed.length_m, place.sensor);
  return temperatureAt(model.tables, (beds[place.tube] as Float64Array)[cell] as number);
}

function leapAt(
  entry: Entry,
  model: StoreModel,
  place: Place,
  i: number,
  lag_m: Float64Array,
): Leap | null {
  const leap = entry.gasSum_K / entry.scans - entry.gas_K;
  const moved =
    (entry.readSum_K[i] as number) / (entry.readCount[i] as number) - (entry.read_K[i] as number);
  if (!(Math.abs(leap) >= LEAP_K) || !Number.isFinite(moved)) return null;
  const tube = model.tubes[place.tube] as TubeModel;
  const { length_m } = model.store.bed;
  const warmed =
    (rockOf(model, entry.beds as Float64Array[], place) - (entry.rock_K[i] as number)) / leap;
  const x = tube.string.thermocouples[place.sensor]?.position_m as number;
  const depth = model.store.charge_inlet_at === 'top' ? x : length_m - x;
  const lag = lag_m[cellOf(tube, length_m, place.sensor)] as number;
  const left = lag > 0 ? Math.exp(-depth / lag) * (1 - warmed) : 0;
  const covered = warmed + GAS_SHARE * left;
  const sigma = Math.hypot(NOISE_K / leap, MODEL_SHARE, GAS_SHARE_SIGMA * left);
  // Rock that has all but followed is no different from gas.
  if (UNCOVERED - covered < 3 * sigma) return null;
  return { value: moved / leap, sigma, covered };
}
