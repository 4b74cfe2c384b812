import { type Hashes, type Job, runJob } from './job.js';

/** Answers the main process; it may have been stopped meanwhile, and then there is no one to tell. */
function tell(answer: { job: Job; cpu_s?: number; error?: string }): void {
  process.send!(answer, () => undefined);
}

/** A worker process: one job at a time, answered when it is done. */
process.on('message', ({ job, hashes }: { job: Job; hashes: Hashes }) => {
  try {
    const before = process.cpuUsage();
    runJob(job, hashes);
    const { user, system } = process.cpuUsage(before);
    tell({ job, cpu_s: (user + system) / 1e6 });
  } catch (error) {
    tell({ job, error: error instanceof Error ? (error.stack ?? '') : String(error) });
  }
});
process.on('disconnect', () => process.exit(0));
