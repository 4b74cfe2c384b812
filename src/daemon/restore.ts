import type { StoredCheckpoint } from '../adapters/history/checkpoints.js';
import type { History } from '../adapters/history/history.js';
import type { Journal } from '../adapters/history/journal.js';
import { isOfTheMachine, type WatchEvent } from '../core/watch/event.js';
import { reasonOf } from '../errors.js';
import type { Log } from '../log.js';
import type { DaemonClock, SteadyClock } from './clock.js';
import type { Counters } from './counters.js';
import type { UnitRunner } from './unitRunner.js';

/** Where a bed is begun anew, this much of the journal is run again for it [ms of arrival]. */
const AFRESH_MS = 86_400_000;
/** Where all beds go on, as much as open scans can be old. */
const SCANS_MS = 3_600_000;
/** What is lost where no saved state can be read. */
const ALL = 'every indicator';

interface RestoreParts {
  readonly journal: Journal;
  readonly history: History;
  readonly clock: DaemonClock;
  readonly steady: SteadyClock;
  readonly counters: Counters;
  readonly log: Log;
}

/**
 * Puts a unit back to its newest checkpoint that can be used, and shows what was last estimated. One of
 * another definition is taken over as far as it fits; a unit without any starts afresh, from the last
 * day of the journal. What was learned as healthy and is lost is logged, counted and in the health.
 */
export function restoreRunner(runner: UnitRunner, parts: RestoreParts): void {
  const { history, log, journal, clock, steady } = parts;
  const { id } = runner.unit;
  const usable = ({ journal_seq }: StoredCheckpoint) => journal_seq <= journal.lastSeq;
  const saved = [
    ...history.checkpoints.list(runner.unit),
    ...history.rewindPoints.before(runner.unit, Number.MAX_SAFE_INTEGER),
  ];
  for (const checkpoint of saved.filter(usable)) {
    try {
      tellLost(runner, runner.restore(checkpoint, steady.now(), standingOf(id, history)), parts);
      history.late.waitAgain(id, checkpoint.journal_seq);
    } catch (thrown) {
      log.warn({ unit: id }, `a checkpoint cannot be used: ${reasonOf(thrown)}`);
      continue;
    }
    showLast(runner, history);
    return;
  }
  for (const checkpoint of history.checkpoints.ofOtherShape(runner.unit).filter(usable)) {
    try {
      takeOver(runner, checkpoint, parts);
    } catch (thrown) {
      log.warn(
        { unit: id },
        `a checkpoint of another definition cannot be used: ${reasonOf(thrown)}`,
      );
      continue;
    }
    showLast(runner, history);
    return;
  }
  const isEmpty = journal.lastSeq === 0;
  runner.startAt(isEmpty ? 0 : journal.seqBefore(clock.now() - AFRESH_MS));
  history.late.waitAgain(id, runner.seq);
  if (isEmpty || !history.checkpoints.hasAny(id)) return;
  log.warn({ unit: id }, 'no checkpoint fits: starts afresh from the last day of the journal');
  tellLost(runner, [ALL], parts);
  returnOrphans(standingOf(id, history), parts, 'The estimator was started afresh');
}

function showLast({ unit: { id }, view }: UnitRunner, history: History): void {
  Object.assign(view, {
    estimate: history.estimates.latest(id),
    profile: history.profiles.latest(id),
    dispatch: history.estimates.latestDispatch(id),
    watch: history.watch.latest(id),
  });
}

function takeOver(runner: UnitRunner, checkpoint: StoredCheckpoint, parts: RestoreParts): void {
  const { history, journal, clock, log } = parts;
  const { id } = runner.unit;
  const { anew, lost, fits } = runner.weigh(checkpoint);
  const standing = standingOf(id, history);
  const keyOf = ({ kind, subject }: WatchEvent) => `${kind}/${subject}`;
  const kept = standing.filter((event) => fits(keyOf(event)));
  const until_ms = Math.min(clock.now(), checkpoint.time_ms);
  const before = journal.seqBefore(until_ms - (anew.length > 0 ? AFRESH_MS : SCANS_MS));
  const from = Math.min(before, checkpoint.journal_seq);
  runner.takeOverLater(checkpoint, from, kept);
  const beds = anew.length === 0 ? 'all beds go on' : `begun anew: bed of ${anew.join(', ')}`;
  log.warn({ unit: id }, `the unit's definition has changed; ${beds}`);
  tellLost(runner, lost, parts);
  const orphans = standing.filter((event) => !kept.includes(event));
  returnOrphans(orphans, parts, 'What it was held against is no more as it was');
}

function tellLost(runner: UnitRunner, lost: readonly string[], parts: RestoreParts): void {
  runner.lost = lost;
  if (lost.length === 0) return;
  parts.counters.add('baselines_lost', lost.length);
  parts.log.warn(
    { unit: runner.unit.id, lost },
    `what was learned as healthy is lost and learned anew, from a plant that may have decayed: ${lost.join(', ')}`,
  );
}

/** What the unit's estimator has raised and not returned. */
function standingOf(unit: string, history: History): WatchEvent[] {
  return history.alarms.active(unit).filter(({ kind }) => !isOfTheMachine(kind));
}

/** What stood and has lost its ground would stand for ever: the new state never raised it. */
function returnOrphans(
  events: readonly WatchEvent[],
  { history, clock }: RestoreParts,
  why: string,
): void {
  const time = new Date(clock.now()).toISOString();
  for (const event of events) {
    const message = `${why}; raised again where it still holds.`;
    history.events.add({ ...event, transition: 'returned', time, message });
  }
}
