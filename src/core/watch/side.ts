import type { IndicatorView } from './indicator.js';

/** Where the newest value of an indicator lies: nothing against healthy, between, or at its limit and beyond. */
export type Side = 'healthy' | 'open' | 'beyond';

/** From this share of a decision on nothing is called healthy that is not decided. */
const SOUND_SCORE = 0.25;

type Placed = Pick<IndicatorView, 'value' | 'healthy' | 'limit' | 'score'>;

/**
 * A test that has not decided is no proof of health: healthy is a value nearer to the healthy one than
 * to the limit, where the test has hardly begun to speak for degraded. Without figures the test alone
 * tells.
 */
export function sideOf({ value, healthy, limit, score }: Placed): Side {
  const silent = (score ?? 0) < SOUND_SCORE;
  if (value === null || healthy === null || limit === healthy) return silent ? 'healthy' : 'open';
  if (limit > healthy ? value >= limit : value <= limit) return 'beyond';
  return (value - healthy) / (limit - healthy) < 0.5 && silent ? 'healthy' : 'open';
}

/** What is said of an indicator that is not degraded: `sound` only of a value on the healthy side. */
export function normalWords(placed: Placed, sound: string): string {
  const side = sideOf(placed);
  if (side === 'healthy') return sound;
  const far = `not decided yet (${decided(placed)} of a decision)`;
  return side === 'beyond' ? `at its limit or beyond, ${far}` : `within its limit, but ${far}`;
}

/** What is added where healthy is still being learned; empty but for a value at the limit or beyond. */
export function learningWords(placed: Placed): string {
  if (sideOf(placed) !== 'beyond') return '';
  return ` The value is at the limit or beyond already: ${decided(placed)} of a decision.`;
}

const decided = ({ score }: Placed): string => `${Math.round(100 * (score ?? 0))} %`;
