import { execFileSync } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { describe, expect, it } from 'vitest';

const program = fileURLToPath(new URL('heapGrowthProcess.ts', import.meta.url));

/** The largest heap of a process that lives on some 65 MB and makes garbage [MB]. */
function largestHeap(how: 'free' | 'bound'): number {
  const args = ['--import', 'tsx', '--max-semi-space-size=8', program, how];
  return JSON.parse(execFileSync(process.execPath, args, { encoding: 'utf8' })).most_MB;
}

describe('the heap of a daemon', () => {
  it('is collected before garbage is a multiple of what lives', () => {
    const free = largestHeap('free');
    const bound = largestHeap('bound');
    // What lives, with 6 MB of a bare process, a fifth of it and the young generation.
    expect(bound).toBeLessThan((64 + 6) * 1.2 + 24);
    expect(free).toBeGreaterThan(1.5 * bound);
  });
});
