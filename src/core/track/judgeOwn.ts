import { isBelieved, type SensorMemory } from './judgeMemory.js';
import { gainAt } from './judgeUsual.js';
import { type Candidate, type JudgeWork, SHARE_SIGMA } from './judgeWork.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeModel } from './tube.js';

/** What the filter has had to take for a sensor's own, so that its readings fit. */
export interface Own {
  /** Offset [K], and place less that of the others of its string [m]. */
  readonly offset_K: number;
  readonly place_m: number;
  /** Both together, in sigmas of what instruments of its class have [-]. */
  readonly sigmas: number;
}

/**
 * Beyond this no class of instrument goes. Where a front is wide and the scans are coarse, what the bed
 * model lacks is taken for places, too: up to 8 sigmas on sound thermocouples of the finer plant.
 */
const IMPOSSIBLE_SIGMAS = 10;
const IMPOSSIBLE_S = 300;
/** Learned for so long, it had been sound before [s]. */
const SOUND_S = 6 * 3600;

/**
 * Offset o and place p that the filter has learned of a sensor, against what its class allows:
 *
 *   D^2 = (o/s_o)^2 + ((p - m)/s_p)^2,   s_o^2 = offset^2 + (gain (T - 0 degC))^2,
 *   s_p^2 = place^2 + (share (lag_charge + lag_discharge))^2 + unseen^2,
 *
 * m the median place of the believed ones of its string (a profile that is off there moves all alike),
 * or none, whichever makes it the less. A share of the gas that the junction sees shows as another place, and so does
 * what the bed model lacks on the way from the next thermocouple (`unseen_m`, see judgeReach).
 */
export function ownOf(
  model: StoreModel,
  state: StoreState,
  work: JudgeWork,
  c: Candidate,
  unseen_m = 0,
): Own {
  const tube = model.tubes[c.tube] as TubeModel;
  const { offset_sigma_K, position_sigma_m } = tube.estimator;
  const memory = state.sensors[c.tube]?.[c.sensor] as SensorMemory;
  const place = ownState(model, state, c.tube, tube.layout.position + c.sensor);
  const offset_K = ownState(model, state, c.tube, tube.layout.offset + c.sensor);
  const gain_K = Number.isFinite(c.rock_K) ? gainAt(c.rock_K) * (c.rock_K - 273.15) : 0;
  const reach_m = memory.reachCharge_m + memory.reachDischarge_m;
  const sigma_m = Math.hypot(position_sigma_m, SHARE_SIGMA * reach_m, unseen_m);
  const offsets = offset_K / Math.hypot(offset_sigma_K, gain_K);
  const alone = Math.hypot(offsets, place / sigma_m);
  // Few are that far off: the others are looked at for those alone.
  if (!(alone >= IMPOSSIBLE_SIGMAS)) return { offset_K, place_m: place, sigmas: alone };
  const from = work.first[c.tube] as number;
  const mates = Array.from({ length: tube.layout.sensors }, (_, i) => i)
    .filter((i) => i !== c.sensor && isBelieved(state.sensors[c.tube]?.[i] as SensorMemory))
    .filter((i) => Number.isFinite((work.candidates[from + i] as Candidate).value_K))
    .map((i) => ownState(model, state, c.tube, tube.layout.position + i))
    .sort((a, b) => a - b);
  const place_m = place - (mates[mates.length >> 1] ?? 0);
  return { offset_K, place_m, sigmas: Math.min(alone, Math.hypot(offsets, place_m / sigma_m)) };
}

/**
 * A slow drift in a front that never passes is soaked up by the states of the sensor's own, and leaves
 * neither the gate nor what is usual there: but these are constants, and of its class.
 *
 * @param memory its `impossible_s` changed in place
 */
export function ownFault(
  memory: SensorMemory,
  { dt_s, own }: { readonly dt_s: number; readonly own?: Own },
): { verdict: 'drifting' | 'offset'; evidence: string; off_K: number } | null {
  if (own === undefined || !(own.sigmas > IMPOSSIBLE_SIGMAS)) {
    memory.impossible_s = 0;
    return null;
  }
  memory.impossible_s = (memory.impossible_s ?? 0) + dt_s;
  if (memory.impossible_s < IMPOSSIBLE_S) return null;
  memory.impossible_s = 0;
  const { offset_K, place_m, sigmas } = own;
  return {
    verdict: memory.usualAge_s > SOUND_S ? 'drifting' : 'offset',
    off_K: memory.recent_K,
    evidence: `its readings would fit with an offset of ${offset_K.toFixed(1)} K and ${Math.round(1000 * place_m)} mm from its place, ${sigmas.toFixed(0)} sigmas of its class`,
  };
}

function ownState(model: StoreModel, state: StoreState, k: number, index: number): number {
  const { layout } = model.tubes[k] as TubeModel;
  return state.tubes[k]?.further[index - layout.cells] as number;
}
