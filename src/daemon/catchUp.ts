import type { Journal } from '../adapters/history/journal.js';
import type { Intake } from '../adapters/mqtt/intake.js';
import type { Log } from '../log.js';
import type { Pipeline } from './pipeline.js';

/** A replay at the start that is longer than this is told [journal entries]. */
const LONG_REPLAY = 5000;

/** Restores the units and takes in what the journal has since. */
export async function catchUp(
  journal: Journal,
  intake: Intake,
  pipeline: Pipeline,
  log: Log,
): Promise<void> {
  // The end of the journal may be sent again.
  for (let seq = Math.max(0, journal.lastSeq - intake.remembered); seq < journal.lastSeq; ) {
    const entries = journal.read(seq, 1000);
    seq = entries.at(-1)?.seq ?? journal.lastSeq;
    intake.remember(entries.filter((entry) => entry.kind === 'reading'));
  }
  pipeline.start();
  const { backlog } = pipeline;
  if (backlog > LONG_REPLAY) log.info(`replays ${backlog} entries of the journal`);
  await pipeline.caughtUp();
}
