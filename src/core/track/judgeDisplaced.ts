import { freshSensor, type SensorMemory } from './judgeMemory.js';
import { type Candidate, innovation, type JudgeWork } from './judgeWork.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import { type TubeDrive, type TubeModel, type TubeState, tubeTemperatures } from './tube.js';

/**
 * With few thermocouples on a string an estimate that is lost shows in one or two of them alone, and
 * they would be taken for faulty ones. Where the profile moved along the bed explains all readings of
 * the string, the front and the sensor are told apart by what follows:
 *
 * - tubes that agree on the displacement, and two readings of a string, are not all at fault;
 * - else the front goes on: with the true front the displacement stays while the front travels, with
 *   a sensor at fault it shrinks or grows by just that way. Half of the way decides.
 *
 * A single reading counts only where the store has no other string to ask. That it lies on the far
 * side's plateau says nothing: a junction shorted in the cabinet reads ambient, which is a plateau too.
 */
export interface Displaced {
  scans: number;
  age_s: number;
  /** Readings off when it began: with more of them it is looked at anew. */
  readings: number;
  /** Displacement found at first, and the way of the front since then [m]. */
  first_m: number;
  travel_m: number;
  /** True where it has turned out to be the sensor. */
  refuted: boolean;
}

/** Off by this share of the references' span at least, in one reading or more: not an offset. */
const OFF_SHARE = 0.15;
/** The displaced profile explains a reading to this share. */
const FIT_SHARE = 0.06;
const LEAST_SCANS = 3;
/** Tubes agree within this [m]. */
const AGREE_M = 0.3;
/** At rest nothing travels: after this long the doubt ends with the sensor [s]. */
const MOST_S = 1800;
/** Way after which the displacement is looked at again [m]. */
const DECIDING_WAY_M = 0.15;

/** Verdicts that a wrong profile may have given. */
const SOFT: ReadonlySet<string | null> = new Set([
  null,
  'offset',
  'drifting',
  'outlier',
  'swapped',
  'wrong_type',
]);

/**
 * Follows each tube's suspicion that its front stands elsewhere. While it is `open` neither profile
 * nor sensors are to be believed: predict only. Once `confirmed` the verdicts of the tube's readings
 * are void, and the profile is to be drawn anew.
 */
export function findDisplaced(
  model: StoreModel,
  state: StoreState,
  work: JudgeWork,
  drive: TubeDrive | null,
): 'none' | 'open' | 'confirmed' {
  const { reference_hot_K: hot, reference_cold_K: cold } = model.store;
  const span = hot - cold;
  const shifts: { k: number; shift: number }[] = [];
  const alone: boolean[] = [];
  const confirmed: number[] = [];
  model.tubes.forEach((tube, k) => {
    const from = work.first[k] as number;
    const own = work.candidates.slice(from, from + tube.layout.sensors).filter((c) => {
      const memory = memoryOf(state, c);
      // One that does not move while its rock does is stuck, whatever it reads.
      const stuck = Math.abs(memory.moved_K) > FIT_SHARE * span;
      return Number.isFinite(c.value_K) && SOFT.has(memory.verdict) && !stuck;
    });
    const off = own.filter(
      (c) => Math.abs(innovation(c)) > Math.max(OFF_SHARE * span, 6 * c.sigma_K),
    );
    if (off.length === 0) {
      state.displaced[k] = null;
      return;
    }
    const before = state.displaced[k] ?? null;
    // More readings off than when it was decided: that is news.
    const known = before !== null && off.length > before.readings ? null : before;
    if (known?.refuted) return;
    const profile = tubeTemperatures(
      tube,
      state.tubes[k] as TubeState,
      new Float64Array(tube.layout.cells),
    );
    const shift = bestShift(tube, profile, own, FIT_SHARE * span);
    if (shift === null) {
      state.displaced[k] = null;
      return;
    }
    const readings = off.length;
    const start = { scans: 0, age_s: 0, readings, first_m: shift, travel_m: 0, refuted: false };
    const now: Displaced = known ?? start;
    now.scans++;
    if (known !== null && drive !== null) {
      now.travel_m += travelOf(model, drive);
      now.age_s += drive.dt_s;
    }
    state.displaced[k] = now;
    shifts.push({ k, shift });
    alone.push(readings === 1 && model.tubes.length > 1);
    if (now.scans < LEAST_SCANS) return;
    const gone = Math.abs(now.travel_m) > DECIDING_WAY_M;
    const stays = gone && Math.abs(shift - now.first_m) < 0.5 * Math.abs(now.travel_m);
    const agreed = shifts.some((o) => o.k !== k && Math.abs(o.shift - shift) < AGREE_M);
    if (agreed || readings > 1 || (stays && model.tubes.length === 1)) confirmed.push(k);
    else if (gone || now.age_s > MOST_S) now.refuted = true;
  });
  if (confirmed.length === 0) {
    const open = ({ k }: { k: number }, i: number): boolean =>
      state.displaced[k]?.refuted === false && !(alone[i] && shifts.length === 1);
    return shifts.some(open) ? 'open' : 'none';
  }
  for (const { k } of shifts) {
    const from = work.first[k] as number;
    const sensors = (model.tubes[k] as TubeModel).layout.sensors;
    for (const c of work.candidates.slice(from, from + sensors)) {
      const memory = memoryOf(state, c);
      if (!SOFT.has(memory.verdict)) continue;
      // All that was held against it was held against a profile that is given up.
      const { seen_K, seen_ms } = memory;
      Object.assign(memory, freshSensor(), { seen_K, seen_ms });
    }
    state.displaced[k] = null;
  }
  return 'confirmed';
}

const memoryOf = (state: StoreState, c: Candidate): SensorMemory =>
  state.sensors[c.tube]?.[c.sensor] as SensorMemory;

/** How far the fronts may stand elsewhere while that is in doubt, as a share of the bed [-]. */
export function displacedSigma(model: StoreModel, state: StoreState): number {
  return model.tubes.reduce((sum, tube, k) => {
    const open = state.displaced[k];
    if (!open || open.refuted) return sum;
    return sum + (tube.string.area_share * Math.abs(open.first_m)) / model.store.bed.length_m;
  }, 0);
}

/** Way of the front in a scan by the metered flow [m], + = charge. */
function travelOf(model: StoreModel, drive: TubeDrive): number {
  const { tables } = model;
  const s = tables.segments >> 1;
  return (
    (drive.massFlux_kg_m2s * drive.dt_s * (tables.fluidHeatCapacity[s] as number)) /
    (tables.heatCapacity[s] as number)
  );
}

/** Displacement of the profile that fits all readings to `within` [m], the least there is; null = none. */
function bestShift(
  tube: TubeModel,
  profile: Float64Array,
  readings: readonly Candidate[],
  within_K: number,
): number | null {
  const cells = profile.length;
  const dx = tube.tables.bed.length_m / cells;
  let best: number | null = null;
  let least = Number.POSITIVE_INFINITY;
  for (let cellsOff = -cells; cellsOff <= cells; cellsOff++) {
    let worst = 0;
    let sum = 0;
    for (const c of readings) {
      const x = (tube.string.thermocouples[c.sensor] as { position_m: number }).position_m;
      const place = Math.min(cells - 1, Math.max(0, x / dx - 0.5 - cellsOff));
      const cell = Math.min(cells - 2, Math.floor(place));
      const a = profile[cell] as number;
      const b = profile[cell + 1] as number;
      const off = c.value_K - (a + (place - cell) * (b - a));
      worst = Math.max(worst, Math.abs(off));
      sum += off * off;
    }
    // Among those that fit, the nearest where readings on plateaus leave a choice.
    const cost = sum + 1e-3 * within_K * within_K * Math.abs(cellsOff);
    if (worst <= within_K && cost < least) {
      least = cost;
      best = cellsOff * dx;
    }
  }
  return best;
}
