import type { History } from '../adapters/history/history.js';
import type { Journal } from '../adapters/history/journal.js';
import { reasonOf } from '../errors.js';
import type { Log } from '../log.js';
import type { DaemonClock, SteadyClock } from './clock.js';
import type { UnitRunner } from './unitRunner.js';

/** Of a unit without a usable checkpoint, this much of the journal is run again [ms of arrival]. */
const AFRESH_MS = 86_400_000;

interface RestoreParts {
  readonly journal: Journal;
  readonly history: History;
  readonly clock: DaemonClock;
  readonly steady: SteadyClock;
  readonly log: Log;
}

/**
 * Puts a unit back to its newest checkpoint that can be used, and shows what was last estimated. A
 * unit without one starts afresh, from the last day of the journal.
 */
export function restoreRunner(runner: UnitRunner, parts: RestoreParts): void {
  const { history, log, journal, clock, steady } = parts;
  const { id } = runner.unit;
  for (const checkpoint of history.checkpoints.list(runner.unit)) {
    if (checkpoint.journal_seq > journal.lastSeq) continue;
    try {
      runner.restore(checkpoint, steady.now());
    } catch (thrown) {
      log.warn({ unit: id }, `a checkpoint cannot be used: ${reasonOf(thrown)}`);
      continue;
    }
    Object.assign(runner.view, {
      estimate: history.estimates.latest(id),
      profile: history.estimates.latestProfile(id),
      dispatch: history.estimates.latestDispatch(id),
      watch: history.watch.latest(id),
    });
    return;
  }
  const isEmpty = journal.lastSeq === 0;
  runner.startAt(isEmpty ? 0 : journal.seqBefore(clock.now() - AFRESH_MS));
  if (isEmpty || !history.checkpoints.hasAny(id)) return;
  log.warn({ unit: id }, 'no checkpoint fits: starts afresh from the last day of the journal');
  returnOrphans(id, parts);
}

/** What stood under the old state would stand for ever: the new one never raised it. */
function returnOrphans(unit: string, { history, clock }: RestoreParts): void {
  const time = new Date(clock.now()).toISOString();
  for (const event of history.alarms.active(unit)) {
    if (event.kind === 'database_unreachable') continue;
    const message = 'The estimator was started afresh; raised again where it still holds.';
    history.events.add({ ...event, transition: 'returned', time, message });
  }
}
