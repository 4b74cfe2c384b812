import { existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { folder } from './folder.js';

/** Seeds 1 to 24 are for tuning; scores are taken with those from here on. */
export const FIXED_FROM = 1000;
/** Fresh seeds come from above all fixed ones. */
const FRESH_FROM = 100_000;

interface Memory {
  /** Fresh seeds of all runs so far. */
  readonly used: readonly number[];
  /** Those of a run that has not ended: it goes on with them. */
  readonly pending: readonly number[];
}

const FILE = join(folder, 'seeds.json');

function remember(memory: Memory, file: string): void {
  mkdirSync(dirname(file), { recursive: true });
  writeFileSync(file, `${JSON.stringify(memory)}\n`);
}

function recall(file: string): Memory {
  if (!existsSync(file)) return { used: [], pending: [] };
  return JSON.parse(readFileSync(file, 'utf8')) as Memory;
}

/** Seeds that no run has used, drawn from the clock and remembered, or those of a run broken off. */
export function freshSeeds(count: number, now_ms: number, file = FILE): number[] {
  const { used, pending } = recall(file);
  if (pending.length === count) return [...pending];
  const known = new Set(used);
  const fresh: number[] = [];
  for (let n = now_ms; fresh.length < count; n++) {
    // Knuth's multiplicative hash spreads neighbouring clocks.
    const seed = FRESH_FROM + (Math.imul(n, 2654435761) >>> 2);
    if (known.has(seed)) continue;
    known.add(seed);
    fresh.push(seed);
  }
  remember({ used: [...known], pending: fresh }, file);
  return fresh;
}

/** The run has ended: the next one draws anew. */
export function seedsDone(file = FILE): void {
  remember({ ...recall(file), pending: [] }, file);
}
