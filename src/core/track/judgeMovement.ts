import {
  celsiusFromCompensated,
  millivoltFromCelsius,
  THERMOCOUPLE_TYPES,
  type ThermocoupleType,
  thermocoupleRange_degC,
} from '../thermocouple/its90.js';

/**
 * How a reading has moved beside how the bed model alone has moved the rock there [K]: sums of steps,
 * which fade with FADE_S. The model's steps, not the change of the estimate, which a wrong reading
 * holds back: what a sensor has bent does not hide it.
 */
export interface Movement {
  /** Reading of the scan before [K]. */
  before_K: number;
  /** By what the reading before it had changed [K]; NaN or absent: not known. */
  came_K?: number;
  read_K: number;
  modelled_K: number;
  /** The same since the reading last leapt against the rock within one scan, as a fault does when it begins. */
  sinceRead_K: number;
  sinceModelled_K: number;
  /** Steps of the rock by the model in scans without a reading, since the last one [K]. */
  unread_K: number;
  /** When gas last flowed in at a temperature that nothing measured. */
  assumed_ms: number;
  /** Reading and rock when another type's table first explained the reading [K]; NaN while none does. */
  firstRead_K: number;
  firstRock_K: number;
}

/** Sums of movement fade over the passage of a front: a metre or two at half a metre an hour. */
const FADE_S = 3 * 3600;
/** A step of a reading against the rock by so many sigma within one scan is no movement. */
const LEAP_SIGMAS = 4.5;
/** Movement of the rock from which on wiring faults can be told [K]: eight sigma of a reading's noise. */
export const MOVES_K = 4;

/** Adds a scan's change of reading and of the rock by the model alone [K] to what it remembers. */
export function followMovement(
  memory: Movement & { readonly expected_K: number; readonly unsettled_ms: number },
  evidence: {
    readonly time_ms: number;
    readonly dt_s: number;
    readonly value_K: number;
    readonly predicted_K: number;
    readonly sigma_K: number;
    readonly inletAssumed?: boolean;
  },
): void {
  if (evidence.inletAssumed) memory.assumed_ms = evidence.time_ms;
  // What the gas does to a junction when its flow changes is not the rock's movement.
  if (evidence.time_ms < memory.unsettled_ms) {
    memory.read_K = memory.modelled_K = 0;
    memory.sinceRead_K = memory.sinceModelled_K = 0;
    memory.before_K = Number.NaN;
    memory.came_K = Number.NaN;
    memory.unread_K = 0;
    return;
  }
  const keep = Math.exp(-evidence.dt_s / FADE_S);
  const step = evidence.predicted_K - memory.expected_K;
  memory.came_K = evidence.value_K - memory.before_K;
  if (!Number.isFinite(evidence.value_K)) {
    memory.read_K *= keep;
    memory.modelled_K *= keep;
    memory.sinceRead_K *= keep;
    memory.sinceModelled_K *= keep;
    memory.unread_K = keep * memory.unread_K + (Number.isFinite(step) ? step : 0);
    return;
  }
  if (Number.isFinite(memory.before_K) && Number.isFinite(memory.expected_K)) {
    const read = evidence.value_K - memory.before_K;
    const modelled = keep * memory.unread_K + step;
    const leapt = Math.abs(read - modelled) > LEAP_SIGMAS * evidence.sigma_K;
    memory.read_K = keep * memory.read_K + read;
    memory.modelled_K = keep * memory.modelled_K + modelled;
    memory.sinceRead_K = leapt ? 0 : keep * memory.sinceRead_K + read;
    memory.sinceModelled_K = leapt ? 0 : keep * memory.sinceModelled_K + modelled;
  }
  memory.before_K = evidence.value_K;
  memory.unread_K = 0;
}

/** The model's movement rests on an inlet that is measured, for as long as sums of movement last. */
export function isMovementKnown(memory: Movement, time_ms: number): boolean {
  return !(time_ms - memory.assumed_ms < FADE_S * 1000);
}

/** The reading has followed the rock where that moved: within a third, as fronts come early or late. */
export function movesAsRock(memory: Movement): boolean {
  const { read_K, modelled_K } = memory;
  return (
    Math.abs(modelled_K) >= MOVES_K && Math.abs(read_K - modelled_K) <= Math.abs(modelled_K) / 3
  );
}

/** Where cold junctions stand: ambient, or a cabinet that is warmer [K]. */
const JUNCTION_K = 298.15;
const JUNCTION_SPREAD_K = 25;
/** The voltage per kelvin of types K, N, T and J falls by up to a third down to -150 degC. */
const BENT = 0.15;
const MIRRORED_K = 50;

/** Reading over rock, both in movement: -1 for reversed wires, less where the reading has held the estimate back. */
const AGAINST = [0.5, 10] as const;
/** Movement that makes it a suspect, and that shows it [K]: the reading then stands off by twice as much. */
const SUSPECT_MOVES_K = 1.5;
const MIRROR_MOVES_K = 2;
/** Movements that both are no error of the estimate nor the difference of two noisy readings, in sigmas. */
const MIRROR_SIGMAS = 3;

/**
 * Reversed wires: the voltage changes sign about the cold junction, so reading + rock = 2 T_junction
 * and the reading moves against the rock, by as much but for the bend of the type's curve. Either
 * the movement shows it, or a difference so great that an offset would hardly be its mirror image.
 *
 * A rock that is hardly known moves by chance.
 *
 * @param sigma_K of the innovation
 * @param noise_K of the reading alone
 * @param moving false where the movement is no evidence
 * @param grew it came to be off little by little, as a drift does: the difference alone is no evidence
 */
export function mirrored(
  memory: Movement,
  value_K: number,
  rock_K: number,
  deadband_K: number,
  sigma_K: number,
  noise_K: number,
  moving: boolean,
  grew = false,
): 'no' | 'suspect' | 'yes' {
  const middle = (value_K + rock_K) / 2;
  const apart = Math.abs(value_K - rock_K);
  const spread = JUNCTION_SPREAD_K + BENT * apart;
  const beside = Math.abs(middle - JUNCTION_K);
  if (!(beside <= spread)) return 'no';
  if (!grew && apart > MIRRORED_K && beside <= spread / 2) return 'yes';
  const { sinceRead_K, sinceModelled_K } = memory;
  const moved = Math.abs(sinceModelled_K) - 2 * deadband_K;
  if (!moving || moved < Math.max(SUSPECT_MOVES_K, MIRROR_SIGMAS * sigma_K)) return 'no';
  if (Math.abs(sinceRead_K) < MIRROR_SIGMAS * Math.SQRT2 * noise_K + deadband_K) return 'no';
  const against = -sinceRead_K / sinceModelled_K;
  if (!(against > AGAINST[0] && against < AGAINST[1])) return 'no';
  return moved < MIRROR_MOVES_K ? 'suspect' : 'yes';
}

/** What an instrument of type `table` makes of a thermocouple of type `wire` at a temperature [degC]. */
export function misread(
  wire: ThermocoupleType,
  table: ThermocoupleType,
  celsius: number,
  junction_degC: number,
): number {
  const [low, high] = thermocoupleRange_degC(wire);
  if (!(celsius > low && celsius < high)) return Number.NaN;
  const millivolt =
    millivoltFromCelsius(wire, celsius) -
    millivoltFromCelsius(wire, junction_degC) +
    millivoltFromCelsius(table, junction_degC);
  const read = celsiusFromCompensated(table, millivolt);
  return typeof read === 'number' ? read : Number.NaN;
}

/** Least error that another type's table must have made [K, sigmas], and how much of it may stay unexplained. */
const MISREAD_K = 15;
const MISREAD_SIGMAS = 12;
const UNEXPLAINED = 0.08;

/** The types [wire, table] that explain what a reading is off by, as a steady offset does by chance; or null. */
export function misreadTypes(
  value_K: number,
  rock_K: number,
  sigma_K: number,
): readonly [ThermocoupleType, ThermocoupleType] | null {
  const off = Math.abs(value_K - rock_K);
  if (off < Math.max(MISREAD_K, MISREAD_SIGMAS * sigma_K)) return null;
  const zero = 273.15;
  let best: readonly [ThermocoupleType, ThermocoupleType] | null = null;
  let least = UNEXPLAINED * off;
  for (const wire of THERMOCOUPLE_TYPES) {
    for (const table of THERMOCOUPLE_TYPES) {
      if (wire === table) continue;
      const read = misread(wire, table, rock_K - zero, JUNCTION_K - zero) + zero;
      const misfit = Math.abs(read - value_K);
      if (!(misfit < least)) continue;
      least = misfit;
      best = [wire, table];
    }
  }
  return best;
}

/** What it is off by must have changed by so much while another table explained it [K, sigmas]. */
const CHANGED_K = 6;
const CHANGED_SIGMAS = 6;

/** True where an offset would not have changed as the other table says it did. */
export function isNoOffset(
  memory: Movement,
  value_K: number,
  rock_K: number,
  sigma_K: number,
): boolean {
  const change = value_K - rock_K - (memory.firstRead_K - memory.firstRock_K);
  return Math.abs(change) > Math.max(CHANGED_K, CHANGED_SIGMAS * sigma_K);
}
