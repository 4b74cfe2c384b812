import { GATE_SIGMAS } from './judge.js';
import { freshSensor, type SensorMemory } from './judgeMemory.js';
import { type Candidate, innovation, type JudgeWork } from './judgeWork.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import { type TubeDrive, type TubeModel, type TubeState, tubeTemperatures } from './tube.js';

/**
 * With few thermocouples on a string an estimate that is lost shows in one or two of them alone, and
 * they would be taken for faulty ones. Where the profile moved along the bed explains all readings of
 * the string, the front and the sensor are told apart by what others read and by what follows:
 *
 * - tubes that agree on the displacement, and two readings of a string, are not all at fault; nor are
 *   one reading and another that left the gate with it, as the moved profile has it;
 * - else the front goes on. All displacements that explain the readings are kept as an interval. With
 *   the true front it holds the same one throughout; with a sensor at fault, whose reading does not
 *   change, it moves back by just the way of the front. When nothing is left that explained all scans,
 *   it was the sensor; when it has not moved as that would, or the next thermocouple is reached where
 *   the moved front says, it is the front.
 *
 * A reading on a plateau is explained by any displacement up to the next thermocouple, so that this
 * may take as long as the front takes from one to the next, and at rest for ever. After DECIDING_WAY_M
 * the others are used again and this one is judged as a sensor, while the sigma of the store goes on
 * saying that the front may be elsewhere.
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
  /** Undecided, but the other readings are used again; absent in a state saved before there was this. */
  aside?: boolean;
  /** The first reading that was off. */
  sensor?: number;
  /** Displacements that explained the readings at first, and those that explained them in all scans [m]. */
  atFirst_m?: Range;
  common_m?: Range;
}

type Range = readonly [least: number, most: number];

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

/** A second reading outside the gate bears the front out where it is explained at least so much better. */
const BEARS_OUT = 0.5;
/** A displacement found anew differs by the cells' size and by what the flow is not known to, of its way. */
const TRAVEL_SHARE = 0.05;

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
  const looks: Look[] = [];
  const confirmed: number[] = [];
  const only = model.tubes.length === 1;
  model.tubes.forEach((_, k) => {
    const look = lookAtTube(model, state, work, drive, k);
    if (look === null) return;
    looks.push(look);
    const { now, off, fit } = look;
    if (now.scans < LEAST_SCANS) return;
    if (
      only &&
      (off.length > 1 || look.borneOut || anotherIsOff(now, off) || isFront(now, fit, model))
    ) {
      confirmed.push(k);
      return;
    }
    const gone = Math.abs(now.travel_m) > DECIDING_WAY_M;
    const agreed = looks.some((o) => o.k !== k && Math.abs(o.fit.best - fit.best) < AGREE_M);
    if (!only && (agreed || off.length > 1)) confirmed.push(k);
    else if (gone || now.age_s > MOST_S) {
      if (only) now.aside = true;
      else now.refuted = true;
    }
  });
  if (confirmed.length === 0) {
    const open = ({ now, off }: Look): boolean => {
      const alone = off.length === 1 && !only && looks.length === 1;
      return !now.refuted && !now.aside && !alone;
    };
    return looks.some(open) ? 'open' : 'none';
  }
  for (const { k } of looks) {
    for (const c of readingsOf(model, work, k)) {
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

/** A tube whose front may stand elsewhere, as one scan shows it. */
interface Look {
  readonly k: number;
  readonly now: Displaced;
  readonly off: readonly Candidate[];
  readonly fit: Fit;
  readonly borneOut: boolean;
}

/** Follows one tube's suspicion; null where there is none that a displacement explains. */
function lookAtTube(
  model: StoreModel,
  state: StoreState,
  work: JudgeWork,
  drive: TubeDrive | null,
  k: number,
): Look | null {
  const tube = model.tubes[k] as TubeModel;
  const span = model.store.reference_hot_K - model.store.reference_cold_K;
  const own = readingsOf(model, work, k).filter((c) => {
    const memory = memoryOf(state, c);
    // One that does not move while its rock does is stuck, whatever it reads.
    const stuck = Math.abs(memory.moved_K) > FIT_SHARE * span;
    return Number.isFinite(c.value_K) && SOFT.has(memory.verdict) && !stuck;
  });
  const off = own.filter(
    (c) => Math.abs(innovation(c)) > Math.max(OFF_SHARE * span, 6 * c.sigma_K),
  );
  const before = state.displaced[k] ?? null;
  // An estimate whose front comes to that sensor agrees with it without being right.
  if (off.length === 0 && before?.aside !== true) {
    state.displaced[k] = null;
    return null;
  }
  // More readings off than when it was decided: that is news.
  const known = before !== null && off.length > before.readings ? null : before;
  if (known?.refuted) return null;
  const profile = new Float64Array(tube.layout.cells);
  tubeTemperatures(tube, state.tubes[k] as TubeState, profile);
  const fit = fitShift(tube, profile, own, FIT_SHARE * span);
  if (fit === null) {
    if (known?.aside) known.refuted = true;
    else state.displaced[k] = null;
    return null;
  }
  const now: Displaced = known ?? {
    ...{ scans: 0, age_s: 0, readings: off.length, first_m: fit.best, travel_m: 0, refuted: false },
    ...{ aside: false, sensor: (off[0] as Candidate).sensor, atFirst_m: fit.range },
    common_m: fit.range,
  };
  now.scans++;
  if (known !== null && drive !== null) {
    now.travel_m += travelOf(model, drive);
    now.age_s += drive.dt_s;
  }
  state.displaced[k] = now;
  const [least, most] = now.common_m ?? fit.range;
  now.common_m = [Math.max(least, fit.range[0]), Math.min(most, fit.range[1])];
  if (now.common_m[0] > now.common_m[1] + roomOf(now, model)) {
    now.refuted = true;
    return null;
  }
  const others = own.filter((c) => c.sensor !== now.sensor);
  const borneOut = others.some((c) => {
    const away = Math.abs(innovation(c));
    const moved = Math.abs(c.value_K - readAt(tube, profile, c, fit.best));
    return away > GATE_SIGMAS * c.sigma_K && moved < BEARS_OUT * away;
  });
  return { k, now, off, fit, borneOut };
}

/** The estimate is off at a second sensor, while one displacement explains what both have read. */
const anotherIsOff = (now: Displaced, off: readonly Candidate[]): boolean =>
  now.aside === true && off.some((c) => c.sensor !== now.sensor);

/**
 * Whether the reading has changed as that of a front does and none that stays as it is: what explained
 * it at first, moved back by the way of the front, explains it no longer.
 */
function isFront(now: Displaced, fit: Fit, model: StoreModel): boolean {
  if (Math.abs(now.travel_m) < DECIDING_WAY_M || now.atFirst_m === undefined) return false;
  const [least, most] = now.atFirst_m;
  const room = Math.max(roomOf(now, model), 0.5 * Math.abs(now.travel_m));
  return fit.range[0] > most - now.travel_m + room || fit.range[1] < least - now.travel_m - room;
}

const roomOf = (now: Displaced, model: StoreModel): number =>
  (2 * model.store.bed.length_m) / (model.tubes[0] as TubeModel).layout.cells +
  TRAVEL_SHARE * Math.abs(now.travel_m);

function readingsOf(model: StoreModel, work: JudgeWork, k: number): readonly Candidate[] {
  const from = work.first[k] as number;
  return work.candidates.slice(from, from + (model.tubes[k] as TubeModel).layout.sensors);
}

const memoryOf = (state: StoreState, c: Candidate): SensorMemory =>
  state.sensors[c.tube]?.[c.sensor] as SensorMemory;

/**
 * How far the fronts may stand elsewhere while that is in doubt, as a share of the bed [-]: rms of the
 * displacements that explain all readings since.
 */
export function displacedSigma(model: StoreModel, state: StoreState): number {
  return model.tubes.reduce((sum, tube, k) => {
    const open = state.displaced[k];
    if (!open || open.refuted) return sum;
    const [a, b] = open.common_m ?? [open.first_m, open.first_m];
    const off_m = Math.sqrt((a * a + a * b + b * b) / 3);
    return sum + (tube.string.area_share * off_m) / model.store.bed.length_m;
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

interface Fit {
  /** The best displacement, the nearest where readings on plateaus leave a choice [m]. */
  readonly best: number;
  /** All that fit, from the least to the most [m]. */
  readonly range: Range;
}

/** Displacements of the profile that fit all readings to `within_K`; null = there is none. */
function fitShift(
  tube: TubeModel,
  profile: Float64Array,
  readings: readonly Candidate[],
  within_K: number,
): Fit | null {
  const cells = profile.length;
  const dx = tube.tables.bed.length_m / cells;
  let best: number | null = null;
  let cost = Number.POSITIVE_INFINITY;
  let least = 0;
  let most = 0;
  for (let off = -cells; off <= cells; off++) {
    let worst = 0;
    let sum = 0;
    for (const c of readings) {
      const away = c.value_K - readAt(tube, profile, c, off * dx);
      worst = Math.max(worst, Math.abs(away));
      sum += away * away;
    }
    if (worst > within_K) continue;
    if (best === null) least = off * dx;
    most = off * dx;
    const own = sum + 1e-3 * within_K * within_K * Math.abs(off);
    if (own >= cost) continue;
    cost = own;
    best = off * dx;
  }
  return best === null ? null : { best, range: [least, most] };
}

/** Rock at a sensor with the profile moved along the bed, its ends as they are [K]. */
function readAt(tube: TubeModel, profile: Float64Array, c: Candidate, shift_m: number): number {
  const cells = profile.length;
  const dx = tube.tables.bed.length_m / cells;
  const x = (tube.string.thermocouples[c.sensor] as { position_m: number }).position_m;
  const place = Math.min(cells - 1, Math.max(0, (x - shift_m) / dx - 0.5));
  const cell = Math.min(cells - 2, Math.floor(place));
  const a = profile[cell] as number;
  return a + (place - cell) * ((profile[cell + 1] as number) - a);
}
