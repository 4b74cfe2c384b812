import type { StoredCheckpoint } from '../../adapters/history/checkpoints.js';
import type { Lost } from '../../adapters/history/history.js';
import type { LateReading } from '../../adapters/history/lateReadings.js';
import type { UnitDefinition } from '../../core/definitions.js';
import type { RewindRecord } from '../../core/scan/rewindRecord.js';
import { isOfTheMachine, type WatchEvent } from '../../core/watch/event.js';
import { toldTime } from '../../core/watch/messages.js';
import type { UnitRunner } from '../unitRunner.js';
import { Rerun } from './rerun.js';
import type { WorkParts } from './work.js';

/** Without any state, this much of the journal is run again [ms of arrival]. */
const AFRESH_MS = 86_400_000;

/** What became of the estimates that a damaged history held. */
export interface Remade {
  readonly record: RewindRecord & { readonly remade: NonNullable<RewindRecord['remade']> };
  /** Alarms that the damaged history lost. */
  readonly events: readonly WatchEvent[];
  /** Late readings whose note was lost; they wait to be taken in again. */
  readonly late: number;
}

/**
 * Makes the estimates again that a damaged history held, piece by piece beside the live unit, from the
 * oldest state that is kept and the journal since; the live one stays as it is. Begun again after a kill
 * it goes on: what is there stays. To be called within transactions.
 *
 * An estimate has as many revisions as its time was withdrawn before; where no state is left it is of an
 * estimator begun anew, hence another one than was told, and has one more.
 *
 * @returns null where nothing was lost
 */
export function* remakeWork(
  live: UnitRunner,
  parts: WorkParts,
): Generator<'more' | 'wait', Remade | null> {
  const { journal, history, clock, rules } = parts;
  const { unit } = live;
  const before_ms = history.lostBefore(unit.id);
  if (before_ms === null) return null;
  const start = oldestStart(unit, before_ms, parts);
  const withdrawn = history.rewinds.withdrawn(unit.id);
  const revisionAt = (time_ms: number) => {
    const times = withdrawn.filter(({ from_ms, to_ms }) => from_ms <= time_ms && time_ms <= to_ms);
    return times.length + (start.isAfresh ? 1 : 0);
  };
  const missing: LateReading[] = [];
  const rerun = new Rerun({
    ...{ journal, history, live, second: start.runner, from_ms: start.time_ms },
    through_seq: history.late.taken(unit.id),
    point_every_ms: rules.point_every_ms,
    isAtRest: () => true,
    fill: { before_ms, revisionAt },
    late: ({ time_ms, seq }) => {
      if (!history.late.has(unit.id, { time_ms, seq })) missing.push({ time_ms, seq });
    },
  });
  yield* rerun.run();
  const { past } = rerun;
  if (missing.length > 0) {
    history.late.add(unit.id, missing);
    history.late.waitAgain(
      unit.id,
      missing.reduce((least, { seq }) => Math.min(least, seq - 1), Infinity),
    );
  }
  history.remade(unit.id);
  const [from, to] = [past.filledFrom_ms ?? before_ms, past.filledTo_ms ?? before_ms];
  const record = {
    unit: unit.id,
    done: new Date(clock.now()).toISOString(),
    from: new Date(from).toISOString(),
    to: new Date(to).toISOString(),
    scans: rerun.scans,
    late_used: 0,
    revised: start.isAfresh ? past.filled : 0,
    revision: history.estimates.newestRevision(unit.id, { from_ms: from, end_ms: to + 1 }),
    differences: [],
    differences_left_out: 0,
    remade: { estimates: past.filled, afresh: start.isAfresh },
  };
  history.rewinds.add(record);
  return { record, events: lostAlarms(live, parts), late: missing.length };
}

/** The oldest state that can be used; without any the unit begins anew. */
function oldestStart(unit: UnitDefinition, before_ms: number, parts: WorkParts) {
  const { history, journal, clock, fresh } = parts;
  // That of the last estimate may have been saved since.
  const end_ms = before_ms - 1;
  const kept = [
    ...history.rewindPoints.before(unit, end_ms),
    ...history.checkpoints.list(unit).filter(({ time_ms }) => time_ms < end_ms),
  ].sort((a, b) => a.time_ms - b.time_ms);
  for (const one of kept) {
    const runner = fresh(unit);
    if (isRestored(runner, one)) return { runner, time_ms: one.time_ms, isAfresh: false };
  }
  const runner = fresh(unit);
  runner.startAt(journal.seqBefore(clock.now() - AFRESH_MS));
  return { runner, time_ms: Number.NEGATIVE_INFINITY, isAfresh: true };
}

function isRestored(runner: UnitRunner, kept: StoredCheckpoint): boolean {
  try {
    runner.restore(kept, 0);
    return true;
  } catch {
    return false;
  }
}

/** What the unit has raised and its alarms do not know any more is raised again. */
function lostAlarms(live: UnitRunner, { history }: WorkParts): WatchEvent[] {
  const time = live.view.estimate?.time;
  if (time === undefined) return [];
  const active = history.alarms.active(live.unit.id).filter(({ kind }) => !isOfTheMachine(kind));
  const known = new Set(active.map(({ id }) => id));
  return live.standing
    .filter(({ id }) => !known.has(id))
    .map((event): WatchEvent => {
      const since = `The damaged history had it; holds since ${toldTime(event.time)}.`;
      return { ...event, time, message: `${event.message} ${since}` };
    })
    .filter((event) => history.events.add(event));
}

/** Up to when units have told estimates, where they have. */
export function toldBy(runners: Iterable<UnitRunner>): Lost[] {
  return [...runners].flatMap(({ unit, view }) =>
    view.estimate ? [{ unit: unit.id, before_ms: Date.parse(view.estimate.time) + 1 }] : [],
  );
}
