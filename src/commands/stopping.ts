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

/** Stops within five seconds, whatever hangs. @returns false where something was left behind */
export async function stopInTime(
  daemon: Pick<Daemon, 'stop'>,
  within_ms = STOP_MS - 500,
): Promise<boolean> {
  let timer: NodeJS.Timeout | undefined;
  const limit = new Promise<boolean>((resolve) => {
    timer = setTimeout(() => resolve(false), within_ms);
  });
  const isWhole = await Promise.race([daemon.stop().then(() => true), limit]);
  clearTimeout(timer);
  return isWhole;
}
