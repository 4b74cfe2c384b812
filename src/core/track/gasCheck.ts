import { enthalpyAt, segmentOf } from '../bed/tables.js';
import type { StoreEnd } from '../definitions.js';
import type { SensorVerdict } from '../estimate.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeModel, TubeState } from './tube.js';

/**
 * The gas-temperature channel at an inlet, held against the rock that its gas has long flowed through:
 * rock near the inlet takes the temperature of the gas, whatever heat transfer and meter are. A channel
 * that is off carries its error into the bed as heat, so it is to be told; but only where it is certain.
 */

/** What is remembered of one inlet. Plain and finite, for the checkpoint. */
export interface GasMemory {
  /** Heat capacity of the gas that entered since its reading has been even [J/m2K]. */
  swept_J_m2K: number;
  /** Least and greatest reading meanwhile [K]. */
  low_K: number;
  high_K: number;
  /** What it was off by when that first showed [K], and what had been swept by then; null: it has not. */
  firstOff_K: number | null;
  firstSwept_J_m2K: number;
  /** Off for certain; until it is shown to be well. */
  doubtful: boolean;
  /** By what it was off when that was last looked at, + = reads too high; and the rock then [K]. */
  off_K: number;
  rock_K: number;
}

/** One scan at one inlet. */
export interface GasScan {
  /** Reading of the gas channel [K]; NaN = none. */
  readonly gas_K: number;
  /** Known flow that enters here [kg/m2s]; 0 where none does or it is not known. */
  readonly massFlux_kg_m2s: number;
  readonly dt_s: number;
  readonly ambient_K: number;
  /** Readings of all channels [K]. */
  readonly values: Float64Array;
  /** What the machine would send into the store, by its model, or NaN [K]; asked for only where it matters. */
  readonly machine_K: () => number;
}

/** Off by more than so many sigma of channel and thermocouples together is an error; less than half is none. */
const OFF_SIGMAS = 6;
/** So much of the metered flow is sure to pass any string: the meter's class, gas that finds channels. */
const FLOW_SURE = 0.85;
/** Rock has at most exp(-2), a seventh of a step of the gas, left to go... */
const SWEPT = 2;
/** Steel of plenum and lid is warmed through after three of its time constants. */
const STEEL_TIMES = 3;
/**
 * ...and a quarter as much gas again takes that down: by four fifths, or, with heat transfer at a sixth
 * of what is believed, by a quarter. What the channel is off by stays.
 */
const LONGER = 1.25;
const KEPT = 0.9;
/**
 * Thermocouples whose own fault is no temperature of rock. Those that are off, drift or seem to be of
 * another type may be right here: a wrong gas temperature has bent the rock that they were held against.
 */
const NO_ROCK: readonly (SensorVerdict | null)[] = [
  'open',
  'burst',
  'stuck',
  'reversed',
  'swapped',
  'outlier',
  'uncovered',
];

export function startGasMemory(): GasMemory {
  return {
    swept_J_m2K: 0,
    low_K: 0,
    high_K: 0,
    firstOff_K: null,
    firstSwept_J_m2K: 0,
    doubtful: false,
    off_K: 0,
    rock_K: 0,
  };
}

/** What a difference between gas and rock must exceed [K], heat losses on the way to the rock left aside. */
export function gasLimit_K(model: StoreModel): number {
  const { inlet_sigma_K, offset_sigma_K, group_offset_sigma_K } = (model.tubes[0] as TubeModel)
    .estimator;
  return OFF_SIGMAS * Math.hypot(inlet_sigma_K, offset_sigma_K, group_offset_sigma_K);
}

/**
 * Takes one scan of an inlet in. The channel becomes doubtful where two or more thermocouples, which
 * agree, all stand in rock that the gas has swept while its reading was even; where they are off from it
 * by more than six sigma and the heat lost on the way; where that has not faded while a quarter as much gas
 * again has passed; and where the machine's model, too, is nearer to the rock. Rock at depth d, with
 * gas lagging by l = G cf/hv, is within exp(-(sqrt Y - sqrt(d/l))^2) of a step of the gas, Y = S/(C l),
 * S the heat capacity of the gas that has passed (tail of Schumann's solution, by Chernoff's bound).
 * It ceases to be doubtful where rock swept so, with the heat transfer that is believed or, where it has
 * been found worse since, the configured one, is within half of that limit.
 */
export function stepGas(
  model: StoreModel,
  state: StoreState,
  end: StoreEnd,
  memory: GasMemory,
  scan: GasScan,
): void {
  const { gas_K, massFlux_kg_m2s: flux, dt_s } = scan;
  if (!(flux > 0) || !Number.isFinite(gas_K)) {
    memory.swept_J_m2K = 0;
    memory.firstOff_K = null;
    return;
  }
  const least = gasLimit_K(model);
  const low = Math.min(memory.low_K, gas_K);
  const high = Math.max(memory.high_K, gas_K);
  if (memory.swept_J_m2K === 0 || high - low > least / 2) {
    memory.low_K = memory.high_K = gas_K;
    memory.swept_J_m2K = 0;
    memory.firstOff_K = null;
  } else {
    memory.low_K = low;
    memory.high_K = high;
  }
  const { tables } = model;
  const segment = segmentOf(tables, enthalpyAt(tables, gas_K));
  const capacity = flux * (tables.fluidHeatCapacity[segment] as number);
  memory.swept_J_m2K += capacity * dt_s;

  const rock = sweptRock(model, state, end, memory, scan.values);
  const limit = least + lossOnTheWay_K(model, end, rock.depth_m, capacity, scan);
  const agreeing = rock.values.filter((value) => Math.abs(value - middle(rock.values)) < limit / 2);
  if (agreeing.length < 2 || 2 * agreeing.length <= rock.values.length) return;
  const mean = agreeing.reduce((sum, value) => sum + value, 0) / agreeing.length;
  // As near as what it has read meanwhile comes.
  const off = Math.max(memory.low_K - mean, 0) - Math.max(mean - memory.high_K, 0);
  if (Math.abs(off) <= limit) {
    memory.firstOff_K = null;
    if (Math.abs(off) <= limit / 2)
      Object.assign(memory, { doubtful: false, off_K: off, rock_K: mean });
    return;
  }
  const machine = scan.machine_K();
  if (Math.abs(gas_K - machine) < Math.abs(mean - machine)) {
    memory.firstOff_K = null;
    return;
  }
  if (memory.firstOff_K === null) {
    memory.firstOff_K = off;
    memory.firstSwept_J_m2K = memory.swept_J_m2K;
  }
  if (memory.swept_J_m2K < LONGER * memory.firstSwept_J_m2K) return;
  if (off / memory.firstOff_K >= KEPT) {
    memory.doubtful = true;
    memory.off_K = off;
    memory.rock_K = mean;
  }
  memory.firstOff_K = off;
  memory.firstSwept_J_m2K = memory.swept_J_m2K;
}

/** Readings in rock that the gas has swept through, and the greatest depth of one [m]. */
function sweptRock(
  model: StoreModel,
  state: StoreState,
  end: StoreEnd,
  { swept_J_m2K, doubtful }: GasMemory,
  readings: Float64Array,
): { values: number[]; depth_m: number } {
  const { bed } = model.store;
  const steel = bed.end_capacity_J_K[end] / bed.area_m2;
  const passed = FLOW_SURE * (swept_J_m2K - STEEL_TIMES * steel);
  const heatCapacity = model.tables.greatestHeatCapacity_J_m3K;
  const values: number[] = [];
  let deepest = 0;
  if (!(passed > 0)) return { values, depth_m: deepest };
  model.tubes.forEach((tube, k) => {
    const { cells } = tube.layout;
    const { gasLag_m, further } = state.tubes[k] as TubeState;
    // What a wrong gas temperature has made of the heat transfer does not keep the doubt.
    const learned = Math.exp(further[tube.layout.transfer - cells] as number);
    const shorter = doubtful ? Math.min(1, learned) : 1;
    tube.string.thermocouples.forEach(({ position_m }, s) => {
      const depth = end === 'charge_inlet' ? position_m : bed.length_m - position_m;
      const cell = Math.min(
        cells - 1,
        Math.max(0, Math.floor((position_m / bed.length_m) * cells)),
      );
      const lag = shorter * Math.abs(gasLag_m[cell] as number);
      const memory = state.sensors[k]?.[s];
      const value = (readings[model.channels[k]?.[s] as number] as number) - (memory?.shift_K ?? 0);
      if (!(lag > 0) || !Number.isFinite(value)) return;
      if (NO_ROCK.includes(memory?.verdict ?? null)) return;
      const ahead = Math.sqrt(passed / (heatCapacity * lag)) - Math.sqrt(depth / lag);
      if (!(ahead * ahead >= SWEPT && ahead > 0)) return;
      values.push(value);
      deepest = Math.max(deepest, depth);
    });
  });
  return { values, depth_m: deepest };
}

/** Fall of the gas by heat lost at the end and at the mantle down to a depth, all of it in one ring [K]. */
function lossOnTheWay_K(
  model: StoreModel,
  end: StoreEnd,
  depth_m: number,
  capacity_W_m2K: number,
  { gas_K, ambient_K }: GasScan,
): number {
  const { bed, strings } = model.store;
  const share = Math.min(1, ...strings.map(({ area_share }) => area_share));
  const mantle = (bed.wall_loss_W_m2K * Math.PI * bed.diameter_m * depth_m) / bed.area_m2 / share;
  const perArea = bed.loss_factor * (bed.end_loss_W_m2K[end] + mantle);
  return Math.abs(gas_K - ambient_K) * Math.min(1, perArea / capacity_W_m2K);
}

function middle(values: readonly number[]): number {
  const sorted = [...values].sort((a, b) => a - b);
  return sorted[(sorted.length - 1) >> 1] ?? Number.NaN;
}
