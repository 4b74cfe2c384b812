/**
 * Nonsense at every door of a real daemon (unit of config/demo.yaml, real mosquitto): messages of random
 * bytes, truncated JSON, hostile nesting, huge numbers, wrong types, huge payloads, unknown topics, bytes
 * as on Sparkplug's topics; then HTTP requests with random methods, paths, queries, headers and bodies.
 *
 *   npm run fuzz -- [--messages 1000000] [--requests 100000] [--seed 1] [--again]
 *
 * It holds where the daemon lives, every message sent is counted once (as taken or as refused, and each
 * reading in it by what became of it), every answer is a success or an error of the documented form and
 * none an error of the daemon's own, and what it keeps does not grow: the least heap in use in the second half, as a
 * collection leaves it, is at most a tenth above that in the first. Resident memory is told beside it:
 * it saws by 100 MB and more with the collections. The environment is that of
 * config/rockhour.service. Pieces done are kept in .fuzz by seed: started again it goes on with
 * the next (memory is judged from there on); --again begins anew. Ends with 1 where something is wrong.
 */
import { existsSync, mkdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import { findProgram, PROGRAMS } from '../test/support/requirements.js';
import { FuzzGround } from './fuzz/ground.js';
import { helpIfAsked } from './help.js';

helpIfAsked(import.meta.url);

const { values } = parseArgs({
  options: {
    messages: { type: 'string', default: '1000000' },
    requests: { type: 'string', default: '100000' },
    seed: { type: 'string', default: '1' },
    again: { type: 'boolean', default: false },
  },
});
const PIECE = { messages: 20_000, requests: 2000 } as const;
const LOOK_MS = 100;
const GROWTH = 0.1;

function refuse(text: string): never {
  console.error(text);
  process.exit(2);
}
function whole(name: 'messages' | 'requests' | 'seed'): number {
  const value = Number(values[name]);
  if (Number.isInteger(value) && value >= 0) return value;
  return refuse(`--${name} must be a whole number, got "${values[name]}"`);
}

const mosquitto =
  findProgram(PROGRAMS.mosquitto.names) ?? refuse('mosquitto is not on this machine');
const root = fileURLToPath(new URL('..', import.meta.url));
if (existsSync(join(root, 'dist/main.js'))) process.env.ROCKHOUR_TEST_BUILT = '1';
const seed = whole('seed');
const folder = join(root, '.fuzz');
const file = join(folder, `seed-${seed}.json`);
if (values.again) rmSync(file, { force: true });
mkdirSync(folder, { recursive: true });
const done: { messages: number; requests: number } = existsSync(file)
  ? JSON.parse(readFileSync(file, 'utf8'))
  : { messages: 0, requests: 0 };

/** The least heap in use among looks each 100 ms: few of them come just behind a collection. */
function leastHeap(): { end(): Promise<number> } {
  let isOver = false;
  const looking = (async () => {
    let least = Infinity;
    do {
      least = Math.min(least, (await ground.metrics()).heap_MB);
      await new Promise((resolve) => setTimeout(resolve, LOOK_MS));
    } while (!isOver);
    return least;
  })();
  return {
    end() {
      isOver = true;
      return looking;
    },
  };
}

const ground = await FuzzGround.start(mosquitto, join(folder, 'run'));
const faults: string[] = [];
try {
  for (const kind of ['messages', 'requests'] as const) {
    const looks: number[] = [];
    const heaps: number[] = [];
    const begun = performance.now();
    const from = done[kind];
    while (done[kind] < whole(kind)) {
      const count = Math.min(PIECE[kind], whole(kind) - done[kind]);
      const heap = leastHeap();
      const found = await ground[kind](seed * 1_000_003 + done[kind], count);
      heaps.push(await heap.end());
      faults.push(...found);
      for (const fault of found.slice(0, 5)) console.error(fault);
      if (found.length > 0) break;
      done[kind] += count;
      writeFileSync(file, JSON.stringify(done));
      looks.push((await ground.metrics()).resident_MB);
      const kept = heaps.at(-1)!.toFixed(1);
      console.error(
        `${done[kind]} ${kind}, ${looks.at(-1)!.toFixed(0)} MB, heap at least ${kept} MB`,
      );
    }
    const s = (performance.now() - begun) / 1000;
    console.log(
      `${kind}: ${done[kind] - from} in ${s.toFixed(0)} s, ${done[kind]} in all, each accounted for`,
    );
    const half = Math.floor(heaps.length / 2);
    if (half === 0) continue;
    const [first, second] = [heaps.slice(0, half), heaps.slice(half)].map((one) =>
      Math.min(...one),
    ) as [number, number];
    console.log(
      `${kind}: heap that is kept ${first.toFixed(1)} MB in the first half, ${second.toFixed(1)} MB in ` +
        `the second; resident memory at most ${Math.max(...looks).toFixed(0)} MB`,
    );
    if (second > first * (1 + GROWTH))
      faults.push(`memory grows: ${heaps.map((one) => one.toFixed(0)).join(' ')}`);
  }
} catch (thrown) {
  faults.push(String(thrown));
}
await ground.stop();
for (const fault of faults.slice(0, 20)) console.log(`WRONG: ${fault}`);
console.log(faults.length === 0 ? 'all as it should be' : `${faults.length} things are wrong`);
process.exit(faults.length === 0 ? 0 : 1);
