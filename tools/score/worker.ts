import { type Hashes, type Job, runJob } from './job.js';

/** A worker process: one job at a time, answered when it is done. */
process.on('message', ({ job, hashes }: { job: Job; hashes: Hashes }) => {
  try {
    const before = process.cpuUsage();
    runJob(job, hashes);
    const { user, system } = process.cpuUsage(before);
    process.send!({ job, cpu_s: (user + system) / 1e6 });
  } catch (error) {
    process.send!({ job, error: error instanceof Error ? (error.stack ?? '') : String(error) });
  }
});
process.on('disconnect', () => process.exit(0));
