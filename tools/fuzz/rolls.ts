import { mulberry } from '../../test/support/random.js';

/** Chance that follows from a seed. */
export class Rolls {
  private readonly random: () => number;

  constructor(seed: number) {
    this.random = mulberry(seed);
  }

  /** A whole number from 0 to below `end`. */
  below(end: number): number {
    return Math.floor(this.random() * end);
  }

  pick<T>(all: readonly T[]): T {
    return all[this.below(all.length)]!;
  }
}

export function randomBytesOf(rolls: Rolls, length: number): Buffer {
  return Buffer.from(Array.from({ length }, () => rolls.below(256)));
}
