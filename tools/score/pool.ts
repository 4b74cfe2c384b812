import { type ChildProcess, fork } from 'node:child_process';
import { fileURLToPath } from 'node:url';

/** What a process answers to a job; the rest is the caller's. */
export interface Answer<J> {
  readonly job: J;
  readonly cpu_s?: number;
  readonly error?: string;
}

const SCORE = new URL('worker.ts', import.meta.url);
const PLAIN = new URL('../plain.mjs', import.meta.url).href;

/**
 * Runs jobs in some processes. A job that fails is told and counted; the others go on.
 * @param hashes sent along with every job
 * @param file what a process runs; it gets `{ job, hashes }` and answers with an `Answer`
 * @returns the failures
 */
export async function runJobs<J, H>(
  jobs: readonly J[],
  hashes: H,
  workers: number,
  done: (job: J, cpu_s: number, answer: Answer<J>) => void,
  file: URL = SCORE,
): Promise<{ job: J; error: string }[]> {
  const waiting = [...jobs];
  const failures: { job: J; error: string }[] = [];
  const running = Array.from({ length: Math.min(workers, jobs.length) }, () =>
    work(waiting, hashes, file, (answer) => {
      const { job, cpu_s, error } = answer;
      if (error !== undefined) failures.push({ job, error });
      done(job, cpu_s ?? 0, answer);
    }),
  );
  await Promise.all(running);
  // Only where all processes have ended before their time.
  for (const job of waiting) failures.push({ job, error: 'not run: no process was left for it' });
  return failures;
}

function work<J, H>(
  waiting: J[],
  hashes: H,
  file: URL,
  done: (answer: Answer<J>) => void,
): Promise<void> {
  const child: ChildProcess = fork(fileURLToPath(file), { execArgv: ['--import', PLAIN] });
  return new Promise((resolve) => {
    let running: J | undefined;
    const next = () => {
      running = waiting.shift();
      if (running) child.send({ job: running, hashes });
      else child.disconnect();
    };
    child.on('message', (answer: Answer<J>) => {
      done(answer);
      next();
    });
    child.on('exit', (code, signal) => {
      if (running) done({ job: running, error: `its process ended: ${signal ?? code}` });
      resolve();
    });
    next();
  });
}
