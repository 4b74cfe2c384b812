import { sideOf } from '../../../core/watch/side.js';
import { DASH, fixed, withSigma } from '../lib/format.js';
import type { Indicator, IndicatorCourse } from './wire.js';

/** How an indicator stands, for a person: changed, undecided, as when healthy, or not known. */
export const STANDINGS = ['changed', 'open', 'healthy', 'unknown'] as const;
export type Standing = (typeof STANDINGS)[number];

export const STANDING_WORDS: Readonly<Record<Standing, string>> = {
  changed: 'changed',
  open: 'not decided',
  healthy: 'as when healthy',
  unknown: 'not known',
};

/**
 * Only a value on the healthy side is called healthy; one at its limit is open although its healthy
 * value is still being learned.
 */
export function standingOf(indicator: Indicator): Standing {
  if (indicator.state === 'degraded') return 'changed';
  const side = sideOf(indicator);
  if (indicator.state === 'normal') return side === 'healthy' ? 'healthy' : 'open';
  return indicator.value !== null && side === 'beyond' ? 'open' : 'unknown';
}

/** What asks for attention first; within that as the server orders them. */
export function byStanding(indicators: readonly Indicator[]): Indicator[] {
  const rank = (one: Indicator) => STANDINGS.indexOf(standingOf(one));
  return [...indicators].sort((a, b) => rank(a) - rank(b));
}

/** Way from the healthy value (0) to the limit (1): the one ruler of all indicators. */
export function alongOf(
  { healthy, limit }: Pick<Indicator, 'healthy' | 'limit'>,
  value: number,
): number | null {
  if (healthy === null || limit === healthy) return null;
  return (value - healthy) / (limit - healthy);
}

/** Digits that tell healthy and limit apart in two figures. */
export function digitsOf({ healthy, limit }: Pick<Indicator, 'healthy' | 'limit'>): number {
  const apart = Math.abs(limit - (healthy ?? 0));
  if (!(apart > 0)) return 2;
  return Math.min(4, Math.max(0, 1 - Math.floor(Math.log10(apart))));
}

/** `0.88 ± 0.13`, with what it is measured in. */
export function valueWords(indicator: Indicator): string {
  const { value, sigma, unit } = indicator;
  // Counts and shares of instruments have no sigma, and those in sigmas are one themselves.
  const open = sigma === null || sigma === 0 || unit === 'sigma' ? null : sigma;
  const text = withSigma(value, open, digitsOf(indicator));
  return value === null ? DASH : `${text}${unitWords(unit)}`;
}

export const figureWords = (indicator: Indicator, value: number | null): string =>
  value === null ? DASH : `${fixed(value, digitsOf(indicator))}${unitWords(indicator.unit)}`;

const unitWords = (unit: string): string =>
  unit === '-' ? '' : unit === 'sigma' ? ' σ' : ` ${unit}`;

/** How many of its sigmas a value lies from the healthy one; null where that is not known. */
export function sigmasOff({ value, sigma, healthy }: Indicator): number | null {
  if (value === null || healthy === null || sigma === null || !(sigma > 0)) return null;
  return Math.abs(value - healthy) / sigma;
}

/** When a change began and when it was sure. */
export interface Since {
  /** Nothing spoke for it until then; null: before what is stored. */
  readonly began: string | null;
  readonly decided: string | null;
}

const SILENT = 0.02;

/**
 * When what is degraded at the end of its course was decided, and since when the test spoke for it:
 * the last time at which its cumulative sum was at zero is the likeliest time of the change.
 */
export function sinceOf(times: readonly string[], course: IndicatorCourse): Since | null {
  let at = course.state.length - 1;
  if (course.state[at] !== 'degraded') return null;
  while (at > 0 && course.state[at - 1] === 'degraded') at--;
  if (at === 0) return { began: null, decided: null };
  const decided = times[at] ?? null;
  while (at >= 0 && (course.score[at] ?? 0) > SILENT) at--;
  return { began: at < 0 ? null : (times[at] ?? null), decided };
}
