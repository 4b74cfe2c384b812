import { MODE_WORDS, percent } from '../lib/format.js';
import { ageNow, type UnitEntry } from '../lib/model.js';
import type { Then } from './asking.js';
import type { AnswerHead } from './wire.js';

/** Change of the state of charge from which on an answer is of another unit, as it were. */
const MOVED = 0.03;

/** Clock of the plant now, as far as its readings tell it [ms]; null before the first. */
export function sourceNow(entry: UnitEntry, tick_ms: number): number | null {
  const time = entry.state?.estimate?.time;
  const age_s = ageNow(entry, tick_ms);
  return time === undefined || age_s === null ? null : Date.parse(time) + age_s * 1000;
}

/** Age of the estimate that an answer stands on [s], growing. */
export function ageOfAnswer(head: AnswerHead, now_ms: number | null): number | null {
  if (now_ms === null) return head.age_s;
  return Math.max(0, (now_ms - Date.parse(head.time)) / 1000);
}

/** Why an answer is of another time by now, in words; null: it still holds. */
export function movedOn(
  head: AnswerHead,
  was: Then,
  entry: UnitEntry,
  now_ms: number | null,
): string | null {
  const estimate = entry.state?.estimate ?? null;
  if (head.stale) return 'It stands on stale readings.';
  if (estimate === null) return null;
  if (was.mode !== null && estimate.mode !== was.mode) {
    return `The unit has moved on: it was ${wordsOfMode(was.mode)}, now it is ${wordsOfMode(estimate.mode)}.`;
  }
  const { state_of_charge: soc } = estimate;
  if (soc !== null && was.state_of_charge !== null) {
    if (Math.abs(soc - was.state_of_charge) >= MOVED) {
      return `The unit has moved on: charge ${percent(was.state_of_charge, 0)} % then, ${percent(soc, 0)} % now.`;
    }
  }
  if (now_ms !== null && now_ms > Date.parse(head.valid_until)) {
    return 'Its time is over: it is older than the unit’s answers are meant to be used.';
  }
  return null;
}

const wordsOfMode = (mode: string): string =>
  MODE_WORDS[mode as keyof typeof MODE_WORDS] ?? 'in an unknown mode';
