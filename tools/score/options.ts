import { parseArgs } from 'node:util';
import type { Scenario } from './scenario.js';
import { QUICK, SCENARIOS } from './scenarios.js';
import { FIXED_FROM } from './seeds.js';

/** A command line that is wrong: the message says what an option takes. */
export class Refusal extends Error {}

function count(name: string, text: string, least: number): number {
  const value = Number(text);
  if (text.trim() !== '' && Number.isInteger(value) && value >= least) return value;
  throw new Refusal(`--${name} must be a whole number of at least ${least}, got "${text}"`);
}

/** The words of an option, or all there are. */
function chosen(name: string, text: string | undefined, all: readonly string[]): Set<string> {
  const words = text === undefined ? all : text.split(',');
  const unknown = words.filter((word) => !all.includes(word));
  if (unknown.length === 0) return new Set(words);
  throw new Refusal(`--${name} must be of ${all.join(', ')}; got ${unknown.join(', ')}`);
}

/**
 * What the words after `npm run score --` ask for.
 * @throws Refusal where an option has a value that it does not take
 */
export function scoreOptions(args: readonly string[]) {
  const { values } = parseArgs({
    args: [...args],
    options: {
      seeds: { type: 'string' },
      fresh: { type: 'string' },
      only: { type: 'string' },
      rows: { type: 'string' },
      tuning: { type: 'boolean', default: false },
      strict: { type: 'boolean', default: false },
      quick: { type: 'boolean', default: false },
      brief: { type: 'boolean', default: false },
      'truths-only': { type: 'boolean', default: false },
      workers: { type: 'string', default: '2' },
    },
  });
  const list = values.quick ? QUICK : SCENARIOS;
  const only = chosen('only', values.only, [
    ...list.map((s) => s.id),
    ...(values.quick ? [] : ['watch']),
  ]);
  const rows = chosen('rows', values.rows, [
    ...new Set(list.flatMap((s) => s.rows.map((r) => r.id))),
  ]);
  const scenarios = list
    .filter((s) => only.has(s.id))
    .map((s): Scenario => ({ ...s, rows: s.rows.filter((r) => rows.has(r.id)) }));
  // A quick run is part of the tests, looked at while building: never at seeds kept for judging.
  const from = values.tuning || values.quick ? 1 : FIXED_FROM;
  const fixed = Array.from(
    { length: count('seeds', values.seeds ?? (values.quick ? '2' : '30'), 1) },
    (_, i) => from + i,
  );
  const workers = count('workers', values.workers, 1);
  // Read, and refused, whether or not this run has fresh seeds.
  const freshAsked = count('fresh', values.fresh ?? '5', 0);
  const none = values.tuning || values.quick || values['truths-only'];
  return { values, list, only, scenarios, fixed, workers, freshCount: none ? 0 : freshAsked };
}
