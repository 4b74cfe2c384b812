import { releaseFromGroup, type SensorMemory, shiftWithGroup } from './judge.js';
import { type Candidate, type Group, innovation, type JudgeWork } from './judgeWork.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeModel, TubeState } from './tube.js';

/** This share of a group, and of the rest of the store, has to bear the common step out. */
const GROUP_SHARE = 0.8;
const GROUP_SIGMAS = 3;
/** So many of a group at least, and so many where the group is all of the store. */
const GROUP_LEAST = 4;
const STORE_LEAST = 3;
/** A step is more than what a group may swing over the day: bound of its class, two sigma, twice. */
const STEP_SIGMAS = 4;
const STEP_LEAST_K = 2;
/** Rock that moved this far along the bed is no explanation of a step [m]. */
const TRAVEL_M = 0.2;

/**
 * A card or cold junction that fails moves all its thermocouples by the same amount, in flat parts
 * of the profile as in the front, and no bed does that: first the common cause is judged, before each
 * sensor by itself. What the readings of the group have in common is then no longer believed: the step is
 * taken off them and the group's offset opened to that of an unknown step, so that their differences,
 * the shape of the profile, stay in use. The verdict ends when the sum of steps and offset is back
 * within the class.
 *
 * @returns true where a tube's covariance was changed
 */
export function judgeGroups(
  model: StoreModel,
  state: StoreState,
  work: JudgeWork,
  usable: (c: Candidate) => boolean,
  time_ms: number,
): boolean {
  let changed = false;
  for (const group of work.groups) {
    const step = commonStep(model, state, work, group, usable);
    if (step !== null) {
      takeStep(model, state, work, group, step, time_ms);
      changed = true;
    }
    releaseGroup(model, state, work, group);
  }
  return changed;
}

const memoryOf = (state: StoreState, c: Candidate): SensorMemory =>
  state.sensors[c.tube]?.[c.sensor] as SensorMemory;

/** The common step of a group [K], null where there is none. */
function commonStep(
  model: StoreModel,
  state: StoreState,
  work: JudgeWork,
  group: Group,
  usable: (c: Candidate) => boolean,
): number | null {
  let n = 0;
  let weights = 0;
  let sum = 0;
  for (const i of group.members) {
    const c = work.candidates[i] as Candidate;
    if (!usable(c)) continue;
    const w = 1 / (c.sigma_K * c.sigma_K);
    n++;
    weights += w;
    sum += w * innovation(c);
  }
  const others = work.candidates.length - group.members.length;
  if (n < (others > 0 ? GROUP_LEAST : STORE_LEAST)) return null;
  const step = sum / weights;
  const sigma = (model.tubes[0] as TubeModel).estimator.group_offset_sigma_K;
  if (Math.abs(step) < Math.max(STEP_LEAST_K, STEP_SIGMAS * sigma)) return null;
  let fit = 0;
  let far = 0;
  let flat = 0;
  let fresh = 0;
  for (const i of group.members) {
    const c = work.candidates[i] as Candidate;
    if (!usable(c)) continue;
    const off = innovation(c);
    if (Math.abs(off - step) <= GROUP_SIGMAS * c.sigma_K) fit++;
    const isFar = off * Math.sign(step) > GROUP_SIGMAS * c.sigma_K;
    if (isFar) far++;
    if (isFar && Math.abs(c.reading.slope_K_m) * TRAVEL_M < Math.abs(step)) flat++;
    if (memoryOf(state, c).outside === 0) fresh++;
  }
  // In the front a reading is too uncertain to tell a step, but has to fit it.
  if (fit < GROUP_SHARE * n || far < STORE_LEAST || 2 * fresh <= n) return null;
  let rest = 0;
  let off = 0;
  let own = 0;
  for (let i = 0; i < work.candidates.length; i++) {
    const c = work.candidates[i] as Candidate;
    if (own < group.members.length && group.members[own] === i) {
      own++;
      continue;
    }
    if (!usable(c)) continue;
    rest++;
    if (Math.abs(innovation(c)) > GROUP_SIGMAS * c.sigma_K) off++;
  }
  // Alone, all of it has to fit, and what is far not by rock that moved.
  if (rest === 0) return fit === n && flat >= STORE_LEAST && 2 * flat >= far ? step : null;
  return off <= (1 - GROUP_SHARE) * rest ? step : null;
}

function takeStep(
  model: StoreModel,
  state: StoreState,
  work: JudgeWork,
  group: Group,
  step: number,
  time_ms: number,
): void {
  const first = memoryOf(state, work.candidates[group.members[0] as number] as Candidate);
  const total = first.shift_K + step;
  const text = `the ${group.members.length} thermocouples of group ${group.name} read ${Math.abs(total).toFixed(1)} K too ${total > 0 ? 'high' : 'low'} together; they are used on without what they have in common`;
  const opened = new Set<number>();
  for (const i of group.members) {
    const c = work.candidates[i] as Candidate;
    shiftWithGroup(memoryOf(state, c), time_ms, text, step);
    c.value_K -= step;
    if (opened.has(c.tube)) continue;
    opened.add(c.tube);
    const { layout } = model.tubes[c.tube] as TubeModel;
    const at = layout.group + (layout.groupOf[c.sensor] as number);
    const p = (state.tubes[c.tube] as TubeState).covariance;
    p[at * (layout.size + 1)] = (p[at * (layout.size + 1)] as number) + step * step;
  }
}

/** Ends the verdict where steps and the group's offset are together within two sigma of its class. */
function releaseGroup(model: StoreModel, state: StoreState, work: JudgeWork, group: Group): void {
  const c = work.candidates[group.members[0] as number] as Candidate;
  const shift = memoryOf(state, c).shift_K;
  if (shift === 0) return;
  const tube = model.tubes[c.tube] as TubeModel;
  const { layout } = tube;
  const at = layout.group + (layout.groupOf[c.sensor] as number) - layout.cells;
  const offset = (state.tubes[c.tube] as TubeState).further[at] as number;
  const bound = 2 * tube.estimator.group_offset_sigma_K;
  if (Math.abs(shift + offset) > Math.max(bound, STEP_LEAST_K / 2)) return;
  const put = new Set<number>();
  for (const i of group.members) {
    const member = work.candidates[i] as Candidate;
    releaseFromGroup(memoryOf(state, member));
    member.value_K += shift;
    member.reading.value_K += shift;
    if (put.has(member.tube)) continue;
    put.add(member.tube);
    const of = (model.tubes[member.tube] as TubeModel).layout;
    const own = of.group + (of.groupOf[member.sensor] as number) - of.cells;
    const { further } = state.tubes[member.tube] as TubeState;
    further[own] = (further[own] as number) + shift;
  }
}
