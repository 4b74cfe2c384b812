import { spawn } from 'node:child_process';
import { monitorEventLoopDelay } from 'node:perf_hooks';
import { fileURLToPath } from 'node:url';
import type { runDemo } from '../../src/daemon.js';

type RunningDemo = Awaited<ReturnType<typeof runDemo>>;

/** What a client got; `refusal` is null for an answer. */
export interface Asked {
  readonly kind: string;
  readonly status: number;
  readonly refusal: { readonly code: string; readonly message: string } | null;
  readonly took_ms: number;
}

export interface Lateness {
  /** How late the main loop came to a timer [ms], at these shares of the time. */
  readonly p50_ms: number;
  readonly p99_ms: number;
  readonly most_ms: number;
  /** By client. */
  readonly asked: readonly (readonly Asked[])[];
}

const RESOLUTION_MS = 10;
const HOUR_MS = 3_600_000;
const ASKERS = fileURLToPath(new URL('askers.mjs', import.meta.url));

/** One of each question about what lies ahead, as a trader's program asks them. */
function questionsTo({ places, daemon }: RunningDemo) {
  const id = daemon.service.unitIds()[0] as string;
  const now_ms = Date.parse(daemon.service.now(id)?.estimate?.time as string);
  const first_ms = Math.ceil(now_ms / 900_000) * 900_000 + HOUR_MS;
  const iso = (ms: number) => new Date(ms).toISOString();
  const block = (n: number, mode: string, power_MW_el: number) => ({
    ...{ mode, power_MW_el },
    from: iso(first_ms + n * HOUR_MS),
    to: iso(first_ms + (n + 1) * HOUR_MS),
  });
  const blocks = [0, 1, 2, 3].map((n) => block(n, 'charge', 2.4));
  const url = `${places.url?.replace(/\/$/, '')}/api/units/${id}/`;
  const starts = [iso(first_ms), iso(first_ms + 4 * HOUR_MS)];
  const offers = { powers_MW_el: [1.2, 1.8], starts, keep: false };
  return [
    { kind: 'hours', url: `${url}hours?power_MW=1.2,1.8` },
    { kind: 'headroom', url: `${url}headroom?power_MW=2.4,3.6` },
    { kind: 'offers', url: `${url}offers`, body: offers },
    {
      kind: 'schedule',
      url: `${url}schedule`,
      body: { blocks: [...blocks, block(5, 'discharge', 1.2)] },
    },
    { kind: 'capability', url: `${url}capability` },
  ];
}

/**
 * How late the main loop of a running daemon, in this process, comes to a timer while clients of
 * another process ask. The simulated plant runs in the same loop: it counts against the daemon.
 *
 * @param clients that ask at once, each its next question as soon as it has an answer
 */
export async function latenessWhileAsked(
  demo: RunningDemo,
  clients: number,
  seconds: number,
): Promise<Lateness> {
  const child = spawn(process.execPath, [ASKERS], { stdio: ['pipe', 'pipe', 'inherit'] });
  const loop = monitorEventLoopDelay({ resolution: RESOLUTION_MS });
  let text = '';
  child.stdout.setEncoding('utf8').on('data', (chunk: string) => {
    text += chunk;
  });
  const ended = new Promise<number | null>((resolve) => child.once('close', resolve));
  child.stdin.end(JSON.stringify({ questions: questionsTo(demo), clients, seconds }));
  loop.enable();
  const code = await ended;
  loop.disable();
  if (code !== 0) throw new Error(`the clients ended with ${code}`);
  const late = (ns: number): number => Math.max(0, ns / 1e6 - RESOLUTION_MS);
  return {
    p50_ms: late(loop.percentile(50)),
    p99_ms: late(loop.percentile(99)),
    most_ms: late(loop.max),
    asked: JSON.parse(text) as Asked[][],
  };
}
