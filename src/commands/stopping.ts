import type { Daemon } from '../daemon.js';

/** A stop takes no longer than this [ms]; what hangs is left behind. */
const STOP_MS = 5000;

/** Resolves at the first SIGTERM or SIGINT; a second one ends the process at once. */
export function askedToStop(): Promise<NodeJS.Signals> {
  return new Promise((resolve) => {
    let isAsked = false;
    for (const signal of ['SIGTERM', 'SIGINT'] as const) {
      process.on(signal, () => {
        if (isAsked) process.exit(130);
        isAsked = true;
        resolve(signal);
      });
    }
  });
}

/** Stops within five seconds, whatever hangs. */
export async function stopInTime(daemon: Pick<Daemon, 'stop'>): Promise<void> {
  let timer: NodeJS.Timeout | undefined;
  const limit = new Promise<void>((resolve) => {
    timer = setTimeout(resolve, STOP_MS - 500);
  });
  await Promise.race([daemon.stop(), limit]);
  clearTimeout(timer);
}
