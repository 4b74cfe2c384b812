import { isBelieved, rename, type SensorMemory } from './judge.js';
import { type Candidate, innovation, type JudgeWork } from './judgeWork.js';

/** Each of the two has to have moved otherwise than its rock by this [K]: four sigma of a reading's noise. */
const STRAYS_K = 2;
/** Rock at the two places has to have moved so differently [K], and by half of the greater movement. */
const MOVES_K = 2.5;
/** Exchanged, their movements must fit so much better (squares). */
const BETTER = 6;
/** Scans in a row before a pair is named. */
const SWAP_SCANS = 5;

const maySwap = ({ verdict }: SensorMemory): boolean =>
  verdict === null ||
  verdict === 'group_fault' ||
  verdict === 'offset' ||
  verdict === 'drifting' ||
  verdict === 'swapped';

/** The profile beside it is still that of its start on one side or both: its movement is a guess, too. */
const isGuess = ({ below_m, above_m }: SensorMemory): boolean => Math.max(below_m, above_m) > 0;

/** It has leapt against the rock within one scan; the sums forget that as they fade (see Movement). */
const hasStepped = ({ read_K, sinceRead_K }: SensorMemory): boolean => read_K !== sinceRead_K;

/**
 * Two thermocouples that were exchanged: each moves as the bed model moves the rock at the other's
 * place (see Movement), and not as at its own. Looked for in pairs of a string or of a card, among
 * those that stray, but for one that has stepped where the rock's movement is a guess: a step is the
 * movement of any rock then. While a pair is suspected neither is used, after five scans both are named.
 *
 * @param suspects set to 1 for each candidate that is not to be used in this scan
 */
export function judgeSwaps(
  work: JudgeWork,
  memories: readonly SensorMemory[],
  time_ms: number,
  suspects: Uint8Array,
): void {
  const { candidates } = work;
  const strays = (i: number): boolean => {
    const memory = memories[i] as SensorMemory;
    return (
      Number.isFinite((candidates[i] as Candidate).value_K) &&
      maySwap(memory) &&
      !(isGuess(memory) && hasStepped(memory)) &&
      Math.abs(memory.read_K - memory.modelled_K) >= STRAYS_K
    );
  };
  for (let a = 0; a < candidates.length; a++) {
    const memory = memories[a] as SensorMemory;
    const partner = strays(a) ? bestPartner(work, memories, a, strays) : -1;
    if (partner < 0) {
      memory.swapScans = 0;
      memory.swapWith = -1;
      continue;
    }
    suspects[a] = 1;
    suspects[partner] = 1;
    memory.swapScans = memory.swapWith === partner ? memory.swapScans + 1 : 1;
    memory.swapWith = partner;
    if (memory.swapScans < SWAP_SCANS || memory.verdict === 'swapped') continue;
    nameSwapped(work, memories, a, partner, time_ms);
    nameSwapped(work, memories, partner, a, time_ms);
  }
}

function nameSwapped(
  work: JudgeWork,
  memories: readonly SensorMemory[],
  own: number,
  other: number,
  time_ms: number,
): void {
  const memory = memories[own] as SensorMemory;
  const moved = memory.read_K.toFixed(1);
  const rock = memory.modelled_K.toFixed(1);
  const there = (memories[other] as SensorMemory).modelled_K.toFixed(1);
  const text = `moved by ${moved} K where the rock moved by ${rock} K, as it did at ${work.id[other]} (${there} K), which reads this one's`;
  const off = memory.read_K - memory.modelled_K;
  if (isBelieved(memory) || memory.verdict !== 'swapped') {
    rename(memory, 'swapped', time_ms, text, off);
  }
}

/** One of the two has to miss its prediction now by so many sigmas. */
const MISS_SIGMAS = 3;

const misses = (c: Candidate): number => Math.abs(innovation(c)) / c.sigma_K;

/** The one whose movement fits exchanged best, -1 = none does. */
function bestPartner(
  work: JudgeWork,
  memories: readonly SensorMemory[],
  a: number,
  strays: (i: number) => boolean,
): number {
  const own = memories[a] as SensorMemory;
  const ca = work.candidates[a] as Candidate;
  const group = work.groupOf[a];
  let best = -1;
  let least = Number.POSITIVE_INFINITY;
  for (let b = 0; b < work.candidates.length; b++) {
    const cb = work.candidates[b] as Candidate;
    const near = cb.tube === ca.tube || (group !== -1 && work.groupOf[b] === group);
    if (b === a || !near || !strays(b)) continue;
    const other = memories[b] as SensorMemory;
    const differ = Math.abs(own.modelled_K - other.modelled_K);
    const most = Math.max(Math.abs(own.modelled_K), Math.abs(other.modelled_K));
    if (differ < MOVES_K || differ < most / 2) continue;
    const apart = (own.read_K - own.modelled_K) ** 2 + (other.read_K - other.modelled_K) ** 2;
    const exchanged = (own.read_K - other.modelled_K) ** 2 + (other.read_K - own.modelled_K) ** 2;
    if (exchanged * BETTER > apart || exchanged >= least) continue;
    if (Math.max(misses(ca), misses(cb)) < MISS_SIGMAS) continue;
    least = exchanged;
    best = b;
  }
  return best;
}
