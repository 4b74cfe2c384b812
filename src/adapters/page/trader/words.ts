import { END_WORDS, fixed, LIMIT_WORDS, percent, power } from '../lib/format.js';
import { spanWords } from './times.js';
import type { FirstMinutes, Limited } from './wire.js';

/** Certainties as those who sell say them. */
const CERTAINTY_WORDS: readonly [number, string, string][] = [
  [0.5, 'even', 'one in two'],
  [0.75, 'likely', 'three in four'],
  [0.9, 'firm', 'nine in ten'],
  [0.95, 'surer', '19 in 20'],
  [0.99, 'surest', '99 in 100'],
];
export const CERTAINTIES = CERTAINTY_WORDS.map(([certainty]) => certainty);
export const FIRM = 0.9;

/** `firm (nine in ten)` for 0.9. */
export function certaintyWords(certainty: number): string {
  const [, name, odds] = CERTAINTY_WORDS.find(([known]) => Math.abs(known - certainty) < 1e-9) ?? [
    0,
    null,
    `${percent(certainty, 0)} in 100`,
  ];
  return name === null ? odds : `${name} (${odds})`;
}

export const oddsOf = (certainty: number): string =>
  CERTAINTY_WORDS.find(([known]) => Math.abs(known - certainty) < 1e-9)?.[2] ??
  `${percent(certainty, 0)} in 100`;

/** A probability as odds: never more certain than it is, `more than 99 in 100` at the most. */
export function chance(probability: number): string {
  if (probability >= 0.995) return 'more than 99 in 100';
  if (probability < 0.005) return 'less than 1 in 100';
  return `${Math.floor(probability * 100 + 1e-9) || 1} in 100`;
}

const CAUSE_WORDS: Readonly<Record<string, string>> = { ...END_WORDS, ...LIMIT_WORDS };

export const causeWords = (cause: string): string => CAUSE_WORDS[cause] ?? cause;

export const POWER_LIMIT_WORDS = {
  power: 'greatest power of the machine',
  connection: 'the connection',
  flow: 'greatest flow',
  pressure_drop: 'greatest pressure drop',
} as const;

export const UNTESTED_WORDS = {
  refused: 'were refused from the beginning',
  not_yet: 'are still to come',
  plan_not_followed: 'the unit did not keep to the plan until the start',
  not_run: 'the unit did not run then',
  other_power: 'it ran at another power',
  stopped_before_a_rule: 'it was stopped before it was empty',
  readings_missing: 'readings are missing',
  superseded: 'were followed by a later offer of the same discharge',
} as const;

export const NEAREST_REASON_WORDS = {
  not_allowed: 'machine, connection and outages leave nothing of it',
  nothing_holds: 'not a minute of it holds, even at the least power',
  not_found: 'none was found in a few tries',
} as const;

/** What may end a discharge, the likeliest first: `cold outlet too warm (91 in 100), ...`. */
export function endsWords(ends_by: Readonly<Record<string, number>>): string {
  const causes = Object.entries(ends_by)
    .filter(([, share]) => share >= 0.005)
    .sort((a, b) => b[1] - a[1]);
  if (causes.length === 1) return causeWords(causes[0]![0]);
  return causes.map(([cause, share]) => `${causeWords(cause)} (${chance(share)})`).join(', ');
}

export function limitedWords(limited: readonly Limited[], clock: (time: string) => string): string {
  return limited
    .map(
      ({ cause, from, to, missing_MW_el }) =>
        `${spanWords(from, to, clock)} ${causeWords(cause)}: ${power(missing_MW_el)} MW less`,
    )
    .join('; ');
}

export function firstMinutesWords(first: FirstMinutes | undefined): string | null {
  if (first === undefined) return null;
  const lasts = `for about ${Math.max(1, Math.ceil(first.minutes))} min`;
  const lacks = `up to ${fixed(first.lacking_MW, 2)} MW less than asked ${lasts}`;
  return `${lacks} at first, while gas that stood is pushed out (${chance(first.probability)})`;
}
