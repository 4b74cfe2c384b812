import { GATE_SIGMAS, judgeSensor, rejectWithGroup, type SensorMemory } from './judge.js';
import { type AcceptedReading, type ReadingModel, readingVariance } from './measurement.js';
import { plausibleRange } from './storeStart.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeModel } from './tube.js';

/** A reading against its prediction, before any update of this scan. */
export interface Candidate {
  readonly tube: number;
  readonly sensor: number;
  readonly value_K: number;
  readonly reading: ReadingModel;
  /** P H' (a row of the tube's scratch) and the sigma of the innovation [K]. */
  readonly v: Float64Array;
  readonly sigma_K: number;
}

export const innovation = (c: Candidate): number => c.value_K - c.reading.value_K;

export const memoryOf = (state: StoreState, c: Candidate): SensorMemory =>
  state.sensors[c.tube]?.[c.sensor] as SensorMemory;

/** Judges every thermocouple; returns those whose reading may be used, with their variances. */
export function judgeAll(
  model: StoreModel,
  state: StoreState,
  candidates: readonly Candidate[],
  time_ms: number,
): (AcceptedReading & { tube: number })[] {
  const range_K = plausibleRange(model);
  const present = candidates.filter((c) => Number.isFinite(c.value_K)).length;
  const accepted: (AcceptedReading & { tube: number })[] = [];
  for (const c of candidates) {
    const judgement = judgeSensor(memoryOf(state, c), {
      time_ms,
      value_K: c.value_K,
      othersPresent: present > 0,
      predicted_K: c.reading.value_K,
      sigma_K: c.sigma_K,
      deadband_K: model.deadbands_K[c.tube]?.[c.sensor] ?? 0,
      range_K,
      supported: isSupported(model, state, candidates, c),
    });
    if (judgement === 'leave_out') continue;
    const innovation_K = innovation(c);
    const tube = model.tubes[c.tube] as TubeModel;
    let variance_K2 = readingVariance(tube, c.reading);
    // Enlarged until the innovation is three of its sigmas: it pulls, but not by its full length.
    if (judgement === 'soften') variance_K2 += innovation_K ** 2 / 9 - c.sigma_K ** 2;
    accepted.push({ ...c, innovation_K, variance_K2 });
  }
  return accepted;
}

/** Deviation to the same side by this many sigmas bears another sensor out. */
const SUPPORT_SIGMAS = 2;

/**
 * True where a sensor beside it on its string, or most of those at its height on other strings,
 * deviate to the same side: then the profile is off there, not the sensor.
 */
function isSupported(
  model: StoreModel,
  state: StoreState,
  candidates: readonly Candidate[],
  c: Candidate,
): boolean {
  const z = innovation(c) / c.sigma_K;
  if (!(Math.abs(z) > GATE_SIGMAS)) return false;
  const agrees = (other: Candidate): boolean =>
    memoryOf(state, other).verdict === null &&
    (innovation(other) / other.sigma_K) * Math.sign(z) > SUPPORT_SIGMAS;
  const beside = candidates.filter((o) => o.tube === c.tube && Math.abs(o.sensor - c.sensor) === 1);
  if (beside.some(agrees)) return true;
  const place = (o: Candidate): number =>
    model.tubes[o.tube]?.string.thermocouples[o.sensor]?.position_m as number;
  const reach = model.store.bed.length_m / 40;
  const level = candidates.filter(
    (o) =>
      o.tube !== c.tube && Number.isFinite(o.value_K) && Math.abs(place(o) - place(c)) <= reach,
  );
  return level.length > 0 && level.filter(agrees).length * 2 > level.length;
}

/** A group is at fault where this share of it deviates to one side and the rest of the store does not. */
const GROUP_SHARE = 0.8;
const GROUP_SIGMAS = 3;
const GROUP_LEAST = 4;

/**
 * A card or cold junction that fails moves all its thermocouples by about the same: first the common
 * cause is judged, before each sensor by itself.
 */
export function rejectFaultyGroups(
  model: StoreModel,
  state: StoreState,
  sound: readonly Candidate[],
  time_ms: number,
): void {
  const groupOf = (c: Candidate): string | null =>
    model.tubes[c.tube]?.string.thermocouples[c.sensor]?.group ?? null;
  const names = new Set(sound.map(groupOf));
  if (names.size < 2) return;
  for (const name of names) {
    if (name === null) continue;
    const own = sound.filter((c) => groupOf(c) === name);
    if (own.length < GROUP_LEAST) continue;
    const z = own.map((c) => innovation(c) / c.sigma_K);
    const up = z.filter((v) => v > GROUP_SIGMAS).length;
    const down = z.filter((v) => v < -GROUP_SIGMAS).length;
    if (Math.max(up, down) < GROUP_SHARE * own.length) continue;
    const others = sound.filter((c) => groupOf(c) !== name);
    const off = others.filter((c) => Math.abs(innovation(c)) > GROUP_SIGMAS * c.sigma_K).length;
    if (others.length === 0 || off > (1 - GROUP_SHARE) * others.length) continue;
    const mean = own.reduce((sum, c) => sum + innovation(c), 0) / own.length;
    const evidence = `${Math.max(up, down)} of ${own.length} thermocouples of group ${name} moved together by ${mean.toFixed(1)} K, the others did not`;
    for (const c of own) rejectWithGroup(memoryOf(state, c), time_ms, evidence);
  }
}
