/**
 * What a sensor usually deviates by from the rock beside it. Its deviation
 *
 *   d = reading - (prediction without the sensor's own offset)
 *
 * is its own offset as it shows now, whatever the filter has learned of it: a slow drift is soaked up
 * by the offset state and never leaves the gate, but d moves, and the class of the instrument
 * allows only so much of that: a gain error as the rock's temperature changes, a position error in
 * the front, the card's swing over the day. The last two are in the sigma of the prediction.
 */
export interface Usual {
  /** Deviation over the last minutes [K]. */
  recent_K: number;
  /** Deviation as it was so far [K], and the temperature of the rock with it [K]. */
  usual_K: number;
  usualRock_K: number;
  /** Sigma of the rock's temperature with it [K]. */
  usualSigma_K: number;
  /** What errors of its place made while it was learned, one sigma [K]. */
  usualPlace_K: number;
  /** 1 while it stands in a front that gas carries past, else 0. */
  passing: number;
  /** Time over which it was learned [s]. */
  usualAge_s: number;
  /** Until when one beside it that was found out may have bent the profile here. */
  doubt_ms: number;
  /** Until when its profile is one that was drawn anew between thermocouples. */
  guess_ms: number;
  /** Time that the deviation has been beyond what is allowed [s]. */
  beyond_s: number;
}

interface UsualEvidence {
  readonly time_ms: number;
  readonly dt_s: number;
  readonly value_K: number;
  readonly rock_K: number;
  readonly rockSigma_K: number;
  readonly placeSigma_K: number;
  readonly offsetSigma_K: number;
  readonly groupSigma_K: number;
  readonly deadband_K: number;
  readonly movesAlike: boolean;
  readonly guessed: boolean;
  readonly flowing: boolean;
}

const RECENT_S = 600;
/** The first hour is taken as it comes; afterwards the usual deviation follows slowly. */
const LEARN_S = 3600;
const USUAL_S = 6 * 3600;
/** It follows a deviation by at most this, so that a drift of 1 K/h runs away from it [K]. */
const FOLLOW_K = 0.5;
/** Half of the tolerance per kelvin from 0 degC: IEC 60584-1, class 2 (0.75 %), class 3 below 0 degC (1.5 %). */
const GAIN_HOT = 0.00375;
const GAIN_COLD = 0.0075;
/** What the bed model makes wrong where the bed is even: standing losses, the mean of a ring [K]. */
const MODEL_K = 0.5;
/** Sigmas, and for how long: see the run length in DEVELOPERS.md. */
const USUAL_SIGMAS = 4;
const BEYOND_S = 300;

/** See GAIN_HOT; at a temperature [K]. */
export const gainAt = (kelvin: number): number => (kelvin < 273.15 ? GAIN_COLD : GAIN_HOT);

/** Learns from one scan what the sensor deviates by of late and usually [K]; nothing is learned in the front. */
export function followUsual(memory: Usual, evidence: UsualEvidence): void {
  const rock = evidence.rock_K;
  const d = evidence.value_K - rock;
  const { dt_s } = evidence;
  if (!Number.isFinite(evidence.rockSigma_K)) return;
  // While its profile is in doubt or a guess, and then until the front has passed, nothing is usual yet.
  const until = Math.max(memory.doubt_ms, memory.guess_ms);
  const doubtful =
    evidence.time_ms < until ||
    evidence.guessed ||
    ((until > 0 || evidence.flowing) && memory.usualAge_s < LEARN_S && inFront(evidence));
  if (Number.isNaN(memory.usual_K) || doubtful) {
    memory.usual_K = d;
    memory.recent_K = d;
    memory.usualRock_K = rock;
    memory.usualSigma_K = evidence.rockSigma_K;
    memory.usualPlace_K = evidence.placeSigma_K;
    memory.usualAge_s = 0;
    return;
  }
  // What it deviated by in the front is over with the front.
  const over = memory.passing === 1 && !passes(evidence);
  memory.passing = passes(evidence) ? 1 : 0;
  if (Number.isNaN(memory.recent_K) || over) memory.recent_K = d;
  memory.recent_K += (d - memory.recent_K) * (1 - Math.exp(-dt_s / RECENT_S));
  memory.usualAge_s += dt_s;
  // While it is being learned, what is now known better than before takes the place of that.
  const better = Math.max(0, 1 - (evidence.rockSigma_K / memory.usualSigma_K) ** 2);
  const slow = 1 - Math.exp(-dt_s / USUAL_S);
  const young = dt_s / (Math.min(LEARN_S, memory.usualAge_s) + dt_s);
  const share = isLearning(memory, evidence) ? Math.max(better, young) : slow;
  if (inFront(evidence)) return;
  const off = memory.recent_K - memory.usual_K;
  memory.usual_K += share * (share > slow ? off : Math.max(-FOLLOW_K, Math.min(FOLLOW_K, off)));
  memory.usualRock_K += share * (rock - memory.usualRock_K);
  memory.usualPlace_K += share * (evidence.placeSigma_K - memory.usualPlace_K);
  memory.usualSigma_K =
    share > slow && better > 0
      ? evidence.rockSigma_K
      : memory.usualSigma_K + share * (evidence.rockSigma_K - memory.usualSigma_K);
}

/** In the front an error of the place reads like any other: nothing is learned there. */
const inFront = (evidence: UsualEvidence): boolean =>
  evidence.placeSigma_K > evidence.offsetSigma_K / 2;

/** While gas flows a front passes within hours: what then remains is the sensor's. */
const passes = (evidence: UsualEvidence): boolean => evidence.flowing && inFront(evidence);

/** In its first hour, and while the bed tells little of it: not twice as well as its class does. */
function isLearning(memory: Usual, evidence: UsualEvidence): boolean {
  return (
    memory.usualAge_s < LEARN_S ||
    evidence.movesAlike ||
    evidence.time_ms < memory.doubt_ms ||
    evidence.time_ms < memory.guess_ms ||
    evidence.rockSigma_K > evidence.offsetSigma_K / 2
  );
}

/** `drifting` or `offset` where the deviation has left what was usual, or the class; else null. */
export function usualFault(
  memory: Usual,
  evidence: UsualEvidence,
): { verdict: 'drifting' | 'offset'; evidence: string; off_K: number } | null {
  const rock = evidence.rock_K;
  const moved = memory.recent_K - memory.usual_K;
  const gain = gainAt(rock);
  const swing =
    evidence.groupSigma_K ** 2 +
    evidence.placeSigma_K ** 2 +
    evidence.deadband_K ** 2 +
    MODEL_K ** 2;
  // Two estimates of one deviation, of which the better holds all that the other does.
  const learned = Math.abs(evidence.rockSigma_K ** 2 - memory.usualSigma_K ** 2);
  const allowed = Math.sqrt(
    learned + swing + memory.usualPlace_K ** 2 + (gain * (rock - memory.usualRock_K)) ** 2,
  );
  const beyondClass = Math.sqrt(
    evidence.rockSigma_K ** 2 + swing + evidence.offsetSigma_K ** 2 + (gain * (rock - 273.15)) ** 2,
  );
  const drifts = Math.abs(moved) > USUAL_SIGMAS * allowed;
  const off = Math.abs(memory.recent_K) > USUAL_SIGMAS * beyondClass && !passes(evidence);
  if (isLearning(memory, evidence) || !((drifts && !inFront(evidence)) || off)) {
    memory.beyond_s = 0;
    return null;
  }
  memory.beyond_s += evidence.dt_s;
  if (memory.beyond_s < BEYOND_S) return null;
  if (drifts) {
    return {
      verdict: 'drifting',
      off_K: moved,
      evidence: `has moved by ${moved.toFixed(1)} K against the rock beside it, where its class allows ${(2 * allowed).toFixed(1)} K`,
    };
  }
  return {
    verdict: 'offset',
    off_K: memory.recent_K,
    evidence: `${memory.recent_K.toFixed(1)} K from the rock beside it, where its class allows ${(2 * beyondClass).toFixed(1)} K`,
  };
}
