import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { FIXED_FROM, freshSeeds, seedsDone } from '../../tools/score/seeds.js';
import { temporaryFolder } from '../support/folders.js';

const file = () => join(temporaryFolder('seeds'), 'deep', 'seeds.json');

describe('fresh seeds', () => {
  it('are never drawn twice, even by the same clock', () => {
    const memory = file();
    const drawn: number[] = [];
    for (let run = 0; run < 20; run++) {
      drawn.push(...freshSeeds(5, 1_700_000_000_000, memory));
      seedsDone(memory);
    }
    expect(new Set(drawn).size).toBe(100);
  });

  it('lie beyond the fixed ones and are whole numbers that a generator of 32 bits tells apart', () => {
    const memory = file();
    for (let run = 0; run < 50; run++) {
      for (const seed of freshSeeds(3, 1_800_000_000_000 + 12_345 * run, memory)) {
        expect(seed).toBeGreaterThan(FIXED_FROM + 10_000);
        expect(seed >>> 0).toBe(seed);
      }
      seedsDone(memory);
    }
  });

  it('stay the same until their run has ended', () => {
    const memory = file();
    const first = freshSeeds(5, 1, memory);
    expect(freshSeeds(5, 2, memory)).toEqual(first);
    seedsDone(memory);
    expect(freshSeeds(5, 2, memory)).not.toEqual(first);
  });
});
