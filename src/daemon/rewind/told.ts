import type { RewindRecord } from '../../core/scan/rewindRecord.js';
import type { Log } from '../../log.js';
import type { Counters } from '../counters.js';

interface Parts {
  readonly counters: Counters;
  readonly log: Log;
}

/** What was done last, for the health of a unit. */
export function rewindWords(last: RewindRecord): string {
  const { done, late_used, scans, revision, restored, remade } = last;
  if (remade) {
    const how = remade.afresh ? 'by an estimator begun anew' : 'from a saved state';
    return `last remade ${done}: ${remade.estimates} estimates that a damaged history had lost, ${how}`;
  }
  const what = restored
    ? `to the backup of ${restored.state_of} by ${restored.who}`
    : `${late_used} late readings`;
  return `last rewind ${done}: ${what}, ${scans} scans made again, revision ${revision}`;
}

/** A rewind, or a unit put back to a backup, is counted and logged. */
export function tellRewound(record: RewindRecord, { counters, log }: Parts): void {
  const { unit, from, to, scans, late_used, revised, restored } = record;
  counters.add('rewinds');
  counters.add('scans_again', scans);
  counters.add('estimates_revised', revised);
  counters.add('late_used', late_used);
  if (restored) {
    counters.add('restores');
    const words = `put back to the state of ${restored.state_of} by ${restored.who}`;
    log.warn({ unit, from, to, scans, revised }, `${words}; ${scans} scans made again`);
  } else
    log.info(
      { unit, from, to, scans, late_used, revised, differences: record.differences.length },
      `${late_used} readings that came late are in their scans now; ${scans} scans made again`,
    );
}

/** Estimates that a damaged history had lost are there again. */
export function tellRemade(record: RewindRecord, { counters, log }: Parts): void {
  const { unit, from, to, scans, revised, remade } = record;
  if (!remade) return;
  counters.add('scans_again', scans);
  counters.add('estimates_remade', remade.estimates);
  counters.add('estimates_revised', revised);
  const how = remade.afresh
    ? 'no state was left: by an estimator begun anew'
    : 'from a saved state';
  log.warn(
    { unit, from, to, scans, ...remade },
    `${remade.estimates} estimates that the damaged history held are made again, ${how}`,
  );
}
