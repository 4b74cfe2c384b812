import { startUnit } from '../../src/core/unit.js';
import type { WatchEvent } from '../../src/core/watch/event.js';
import type { IndicatorView } from '../../src/core/watch/indicator.js';
import { lotOf } from './branches.js';
import { branchOf, stretch } from './watchJob.js';
import { type Look, watchRecording } from './watchRun.js';
import { makeBranches, makeWeeks, prepareTruths } from './watchTruth.js';
import { watchedUnit } from './watchUnit.js';

export interface TraceOptions {
  readonly seed: number;
  /** A branch, `lead`, or `weeks`. */
  readonly branch: string;
  /** Kinds of indicators to show; empty = all. */
  readonly only: readonly string[];
  /** Hours between two looks. */
  readonly every_h: number;
  /** Show the healthy stretch before the onset, too. */
  readonly before: boolean;
  readonly write: (line: string) => void;
}

/**
 * Runs one branch with the code as it is now and writes, hour by hour, what has changed of each
 * indicator, and at once what is raised, returned or believed.
 */
export function trace(options: TraceOptions, truthHash: string): void {
  const { seed, branch: id, write } = options;
  prepareTruths(truthHash);
  const hashes = { truth: truthHash };
  if (id === 'weeks') {
    makeWeeks(seed, truthHash);
    const unit = watchedUnit('demo');
    watchRecording(unit, startUnit(unit), stretch(seed, 'weeks', hashes), looker(options, true));
    return;
  }
  makeBranches(seed, truthHash, [id]);
  const branch = branchOf(id);
  const unit = watchedUnit(branch?.unit ?? 'demo');
  const state = startUnit(unit);
  const before =
    branch === undefined ? ['lead'] : branch.onset === 'way' ? ['lead', 'way'] : ['lead'];
  for (const name of before) {
    write(`== ${name}, healthy`);
    const shown = options.before || branch === undefined;
    watchRecording(unit, state, stretch(seed, name, hashes), looker(options, shown));
  }
  if (branch === undefined) return;
  const { store, string, sign } = lotOf(seed, id);
  write(`== ${id}: ${branch.words}; by lot: store ${store}, string ${string}, sign ${sign}`);
  watchRecording(unit, state, stretch(seed, id, hashes), looker(options, true));
}

function looker({ only, every_h, write }: TraceOptions, hourly: boolean): Look {
  let next_h = every_h;
  const shown = new Map<string, string>();
  let believed = '';
  return (t_h, watch, events) => {
    for (const event of events) write(eventLine(t_h, event));
    const causes = watch.causes
      .slice(0, 3)
      .map((c) => `${c.cause} ${c.subject} ${c.probability.toFixed(2)}`);
    const first = causes[0]?.replace(/ [\d.]+$/, '') ?? '';
    if (first !== believed) {
      believed = first;
      write(`${at(t_h)}  CAUSE ${causes.join(', ') || 'none'}`);
    }
    if (!hourly || t_h < next_h - 1e-9) return;
    next_h += every_h;
    for (const view of watch.indicators) {
      if (only.length > 0 && !only.includes(view.kind)) continue;
      const key = `${view.kind} ${view.subject}`;
      const text = viewText(view);
      if (shown.get(key) === text) continue;
      shown.set(key, text);
      write(`${at(t_h)}  ${key.padEnd(28)} ${text}`);
    }
  };
}

const at = (t_h: number): string => `${t_h.toFixed(2).padStart(6)} h`;

function eventLine(t_h: number, event: WatchEvent): string {
  const value = event.value === null ? '' : ` at ${number(event.value)}`;
  const what = `${event.transition.toUpperCase()} ${event.class} ${event.kind} ${event.subject}`;
  return `${at(t_h)}  ${what}${value}: ${event.message}`;
}

function viewText(view: IndicatorView): string {
  const { value, sigma, healthy, healthy_from, limit, score, state, reason, unit } = view;
  return [
    `value ${number(value).padStart(8)} +/- ${number(sigma).padStart(8)} ${unit}`,
    `healthy ${number(healthy).padStart(8)}${healthy_from === null ? '' : ` ${healthy_from}`}`,
    `limit ${number(limit)}`,
    `score ${score === null ? '-' : score.toFixed(2)}`,
    reason === null ? state : `${state} (${reason})`,
  ].join('  ');
}

const number = (value: number | null): string => (value === null ? '-' : value.toPrecision(4));
