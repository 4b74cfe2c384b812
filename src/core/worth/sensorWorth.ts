import type { StoreModel, StoreState } from '../track/storeTracker.js';
import type { TubeModel, TubeScratch } from '../track/tube.js';
import { followOrigin } from '../track/unseenFlow.js';
import { stepWall, type WallState } from '../track/wallZone.js';
import type { Course, CourseStep, TubeMean } from './course.js';
import { freshState } from './freshState.js';
import { storeSigmas, tallyVariant } from './storeVariant.js';
import { answerOf, type StoreWorth } from './storeWorth.js';
import { makeVariants, type Variants, type WorthOptions } from './variants.js';
import { stepWeighed, takeMean, type WeighedTube, weighedTube } from './weighedTube.js';

/** Without readings sigmas are formed this often [s]. */
const LONGEST_UNWEIGHED_S = 900;

/**
 * What each thermocouple of a store is worth: the covariance recursion of its tubes along a course,
 * with all thermocouples until the loss, from then on once for each thing lost or added, all side by
 * side. Nothing is read: see `WeighedTube`. Only the tubes that a change touches run again, and the
 * store's sigmas are formed as the estimate forms them, with what the tubes share.
 *
 * A generator, so that whoever drains it can show progress and stop: yields the share done, returns
 * the answer.
 *
 * @param s index of the store in the course
 * @throws RangeError for a course that weighs nothing, or has no store `s`
 */
export function* weighSensors(
  store: StoreModel,
  s: number,
  course: Course,
  options: WorthOptions,
): Generator<number, StoreWorth> {
  const start = course.start[s];
  if (start === undefined) throw new RangeError(`store ${s}: not there`);
  const { steps, loss_at, weigh_from } = course;
  if (!(loss_at <= weigh_from && weigh_from < steps.length)) {
    throw new RangeError(`weigh_from = ${weigh_from}: expected ${loss_at} to ${steps.length - 1}`);
  }
  const known = course.states?.[s];
  const state =
    known === undefined ? freshState(store, start, options.out_of_use) : structuredClone(known);
  const base = store.tubes.map((tube, k): WeighedTube => {
    const own = state.tubes[k] as WeighedTube['state'];
    return weighedTube(tube, (id) => !options.out_of_use.has(id), own);
  });
  let variants: Variants | null = null;
  const total = workOf(store, course, options);
  let done = 0;
  let since_s = 0;
  for (let n = 0; n < steps.length; n++) {
    if (n === loss_at) variants = makeVariants(store, base, options);
    const step = steps[n] as CourseStep;
    const drive = step.drives[s] as CourseStep['drives'][number];
    for (const tube of base) stepWeighed(tube, drive, step.scans);
    moveMean(store, state, base, step, s);
    // As recorded: a profile that was drawn anew knows nothing of the rock at the wall.
    state.known_s = step.known_s?.[s] ?? state.known_s + drive.dt_s;
    if (variants !== null) {
      for (const { k, tube } of variants.tubes) {
        stepWeighed(tube, drive, step.scans);
        takeMean(tube, state.tubes[k] as TubeMean, (store.tubes[k] as TubeModel).layout);
      }
    }
    followOrigin(store, state, false);
    done += base.length + (variants?.tubes.length ?? 0);
    if (n >= weigh_from && variants !== null) {
      since_s += drive.dt_s;
      // Between readings sigma hardly grows, and it costs as much to form as the step itself.
      if (step.scans > 0 || since_s >= LONGEST_UNWEIGHED_S || n + 1 === steps.length) {
        const compared = storeSigmas(store, state, new Map()).soc;
        const weight = { dt_s: since_s, mode: step.mode, compared };
        for (const variant of variants.all) tallyVariant(variant, store, state, weight);
        since_s = 0;
      }
    }
    yield done / total;
  }
  return answerOf(store, variants as Variants, options);
}

/** The mean of the tubes: as recorded, else the model's own, with the zone at the wall. */
function moveMean(
  store: StoreModel,
  state: StoreState,
  base: readonly WeighedTube[],
  step: CourseStep,
  s: number,
): void {
  const recorded = step.means?.[s];
  if (recorded !== undefined) {
    base.forEach((tube, k) => {
      takeMean(tube, recorded[k] as TubeMean, tube.model.layout);
    });
    takeWall(state, step.walls?.[s] ?? null);
    return;
  }
  if (store.wall === null || state.wall === null) return;
  const { tube: k } = store.wall;
  const { model, state: tube } = base[k] as WeighedTube;
  const drive = step.drives[s] as CourseStep['drives'][number];
  stepWall(store.wall, model, tube, state.wall, drive, store.scratch[k] as TubeScratch);
}

/** Layers at the wall as recorded: what they lag behind the string is a part of sigma. */
function takeWall({ wall }: StoreState, recorded: WallState | null): void {
  if (wall === null || recorded === null) return;
  recorded.enthalpy.forEach((own, l) => {
    (wall.enthalpy[l] as Float64Array).set(own);
  });
  wall.steel_K.set(recorded.steel_K);
  wall.outlet_K.set(recorded.outlet_K);
}

/** Steps of tubes that a course takes, for progress: about right, a shared tube counts twice. */
function workOf(store: StoreModel, course: Course, options: WorthOptions): number {
  const { length } = course.steps;
  const sensors = store.channels.flat().length;
  const strings = store.tubes.length;
  const beside = sensors + strings * (options.places + 1);
  return strings * length + beside * (length - course.loss_at);
}
