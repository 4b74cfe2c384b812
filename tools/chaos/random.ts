/** Chance with a seed (mulberry32): a run that lost something can be run again. */
export class Random {
  constructor(private state: number) {}

  /** In [0, 1). */
  next(): number {
    this.state = (this.state + 0x6d2b79f5) | 0;
    let t = Math.imul(this.state ^ (this.state >>> 15), 1 | this.state);
    t = (t + Math.imul(t ^ (t >>> 7), 61 | t)) ^ t;
    return ((t ^ (t >>> 14)) >>> 0) / 4294967296;
  }

  between(least: number, most: number): number {
    return least + (most - least) * this.next();
  }
}
