import { type Hashes, type Job, runJob } from './job.js';

/** A worker process: one job at a time, answered when it is done. */
process.on('message', ({ job, hashes }: { job: Job; hashes: Hashes }) => {
  try {
    runJob(job, hashes);
    process.send!({ job });
  } catch (error) {
    process.send!({ job, error: error instanceof Error ? (error.stack ?? '') : String(error) });
  }
});
process.on('disconnect', () => process.exit(0));
