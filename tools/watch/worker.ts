import { runWatchJob, type WatchCost, type WatchHashes, type WatchJob } from './watchJob.js';

/** What a worker answers. */
export interface WatchAnswer {
  readonly job: WatchJob;
  readonly cpu_s?: number;
  readonly cost?: WatchCost;
  readonly error?: string;
}

/** Answers the main process; it may have been stopped meanwhile, and then there is no one to tell. */
function tell(answer: WatchAnswer): void {
  process.send?.(answer, () => undefined);
}

/** A worker process: one job at a time, answered when it is done. */
process.on('message', ({ job, hashes }: { job: WatchJob; hashes: WatchHashes }) => {
  try {
    const cost = runWatchJob(job, hashes);
    tell({ job, cpu_s: cost.truth_s + cost.run_s, cost });
  } catch (error) {
    tell({ job, error: error instanceof Error ? (error.stack ?? '') : String(error) });
  }
});
process.on('disconnect', () => process.exit(0));
