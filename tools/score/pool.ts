import { type ChildProcess, fork } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import type { Hashes, Job } from './job.js';

/**
 * Runs jobs in some processes. A job that fails is told and counted; the others go on.
 * @returns the failures
 */
export async function runJobs(
  jobs: readonly Job[],
  hashes: Hashes,
  workers: number,
  done: (job: Job, cpu_s: number) => void,
): Promise<{ job: Job; error: string }[]> {
  const waiting = [...jobs];
  const failures: { job: Job; error: string }[] = [];
  const running = Array.from({ length: Math.min(workers, jobs.length) }, () =>
    work(waiting, hashes, (job, cpu_s, error) => {
      if (error !== undefined) failures.push({ job, error });
      done(job, cpu_s);
    }),
  );
  await Promise.all(running);
  // Only where all processes have ended before their time.
  for (const job of waiting) failures.push({ job, error: 'not run: no process was left for it' });
  return failures;
}

function work(
  waiting: Job[],
  hashes: Hashes,
  done: (job: Job, cpu_s: number, error?: string) => void,
): Promise<void> {
  const file = fileURLToPath(new URL('worker.ts', import.meta.url));
  const child: ChildProcess = fork(file, { execArgv: ['--import', 'tsx'] });
  return new Promise((resolve) => {
    let running: Job | undefined;
    const next = () => {
      running = waiting.shift();
      if (running) child.send({ job: running, hashes });
      else child.disconnect();
    };
    child.on('message', (answer: { job: Job; cpu_s?: number; error?: string }) => {
      done(answer.job, answer.cpu_s ?? 0, answer.error);
      next();
    });
    child.on('exit', (code, signal) => {
      if (running) done(running, 0, `its process ended: ${signal ?? code}`);
      resolve();
    });
    next();
  });
}
