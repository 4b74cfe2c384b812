import type { History } from '../../adapters/history/history.js';
import type { Journal } from '../../adapters/history/journal.js';
import { MOST_DIFFERENCES, type RewindRecord } from '../../core/scan/rewindRecord.js';
import { isOfTheMachine, type WatchEvent } from '../../core/watch/event.js';
import { differences, hindsight } from '../../core/watch/hindsight.js';
import type { DaemonClock } from '../clock.js';
import type { Counters } from '../counters.js';
import type { Notices } from '../notices.js';
import type { UnitRunner } from '../unitRunner.js';
import type { GivenStart } from './given.js';
import { planRewind } from './plan.js';
import { Rerun } from './rerun.js';
import type { RewindRules } from './rules.js';

export interface WorkParts {
  readonly journal: Journal;
  readonly history: History;
  readonly clock: DaemonClock;
  readonly counters: Counters;
  readonly notices: Notices;
  readonly rules: RewindRules;
  /** A runner of a unit without a past. */
  fresh(unit: UnitRunner['unit']): UnitRunner;
  /** It has closed scans to work off. */
  isBusy(runner: UnitRunner): boolean;
}

/** What a rewind comes to, to be taken over once it is written. */
export interface Outcome {
  readonly rerun: Rerun;
  readonly second: UnitRunner;
  readonly record: RewindRecord;
  readonly events: readonly WatchEvent[];
}

/**
 * A rewind of a unit piece by piece, to be called within transactions: all but putting the new state in
 * the live one's place, which is done when the last transaction is. `wait`: the live one goes on first.
 *
 * @param through_seq late readings up to this number of the journal
 * @returns null where nothing was to be done
 */
export function* rewindWork(
  live: UnitRunner,
  through_seq: number,
  parts: WorkParts,
): Generator<'more' | 'wait', Outcome | null> {
  const { journal, history, counters, rules, fresh, isBusy } = parts;
  const { unit } = live;
  const planning = planRewind(live, through_seq, {
    ...{ journal, history, fresh: () => fresh(unit) },
    ...rules,
  });
  let planned = planning.next();
  for (; !planned.done; planned = planning.next()) yield 'more';
  const { start, used, repeated, too_late, wrong_zone } = planned.value;
  counters.add('wrong_zone', wrong_zone);
  tellUseless(unit.id, repeated, too_late, parts);
  if (start === null) {
    history.late.take(unit.id, through_seq);
    return null;
  }
  const second = start.runner;
  const rerun = new Rerun({
    ...{ journal, history, live, second, from_ms: start.time_ms, through_seq },
    point_every_ms: rules.point_every_ms,
    isAtRest: () => !isBusy(live),
  });
  yield* rerun.run();
  return conclude(rerun, second, used, through_seq, parts);
}

/** The same from a state that was given, instead of a stored one; what is late and waits waits on. */
export function* restoreWork(
  live: UnitRunner,
  start: GivenStart,
  parts: WorkParts,
): Generator<'more' | 'wait', Outcome | null> {
  const { journal, history, counters, rules, isBusy } = parts;
  const { id } = live.unit;
  const { second, enter_from_ms, from_seq } = start;
  const { time_ms: from_ms } = start.checkpoint;
  if (live.isAwaiting) throw new RangeError(`unit ${id} is still being put back to another state`);
  const through_seq = history.late.taken(id);
  const too_late = history.late.countBefore(id, enter_from_ms, from_seq);
  const rerun = new Rerun({
    ...{ journal, history, live, second, from_ms, through_seq, enter_from_ms },
    point_every_ms: rules.point_every_ms,
    isAtRest: () => !isBusy(live),
  });
  yield* rerun.run();
  counters.add('too_late', too_late);
  // It has been through all entries that the live one has, though they may all be of other units.
  second.startAt(live.seq);
  return conclude(rerun, second, 0, null, parts, start);
}

/** What a rewind comes to, in the same transaction as its last scan. */
function conclude(
  rerun: Rerun,
  second: UnitRunner,
  used: number,
  through_seq: number | null,
  { history, clock, rules }: WorkParts,
  given?: GivenStart,
): Outcome {
  const { unit } = second;
  rerun.past.end();
  rerun.dropStates();
  const state = second.checkpoint();
  if (state) history.checkpoints.add(unit, state);
  if (through_seq !== null) history.late.take(unit.id, through_seq);
  if (given) keepGiven(given, state !== null, history, rules);
  const { reached_ms } = rerun;
  const span = { from_ms: Math.min(rerun.from_ms, reached_ms), end_ms: reached_ms + 1 };
  const own = ({ kind }: WatchEvent) => !isOfTheMachine(kind);
  const told = history.events.between(unit.id, span.from_ms, span.end_ms, 10_000).filter(own);
  const found = differences(told, rerun.events, unit.scan_period_s * 1000);
  const time = new Date(rerun.reached_ms).toISOString();
  const active = history.alarms.active(unit.id).filter(own);
  const by = given ? 'the state that the unit was put back to' : undefined;
  const events = hindsight(active, second.standing, time, by).filter((one) =>
    history.events.add(one),
  );
  const newest = history.estimates.latest(unit.id);
  if (newest) second.view.estimate = newest;
  const record: RewindRecord = {
    unit: unit.id,
    done: new Date(clock.now()).toISOString(),
    from: new Date(span.from_ms).toISOString(),
    to: time,
    scans: rerun.scans,
    late_used: used,
    revised: rerun.past.revised,
    revision: history.estimates.newestRevision(unit.id, span),
    differences: found.slice(0, MOST_DIFFERENCES),
    differences_left_out: Math.max(0, found.length - MOST_DIFFERENCES),
    ...(given ? { restored: given.restored } : {}),
  };
  history.rewinds.add(record);
  return { rerun, second, record, events };
}

/** States of before are of what was put aside; no late reading brings them back. */
function keepGiven(
  { second, checkpoint, shape }: GivenStart,
  isTakenOver: boolean,
  history: History,
  { point_every_ms }: RewindRules,
): void {
  const { unit } = second;
  history.rewindPoints.forgetAfter(unit.id, Number.MIN_SAFE_INTEGER, checkpoint.time_ms + 1);
  if (shape === null) history.rewindPoints.add(unit, checkpoint, point_every_ms);
  // It comes to its time with readings that are still to come; a restart before has it from here.
  else if (!isTakenOver) history.checkpoints.addOf(unit, shape, checkpoint);
}

function tellUseless(
  unit: string,
  repeated: number,
  too_late: number,
  { counters, notices }: WorkParts,
): void {
  counters.add('late_repeated', repeated);
  counters.add('too_late', too_late);
  if (repeated > 0) {
    const why = 'their scans have values of these channels';
    notices.info(
      `late_repeated ${unit}`,
      `unit ${unit}: ${repeated} late readings left out: ${why}`,
    );
  }
  if (too_late > 0) {
    const why = 'no state is kept from before them';
    notices.warn(`too_late ${unit}`, `unit ${unit}: ${too_late} late readings not used: ${why}`);
  }
}
