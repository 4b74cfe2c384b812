/**
 * Seeded random numbers of the finer plant (sfc32, Doty-Humphrey). Every use has a stream of its
 * own, named by a label, so that adding a draw in one place changes none in another.
 */
export class RandomStream {
  private readonly state: Uint32Array;

  constructor(seed: number, label: string) {
    // FNV-1a over the label, mixed with the seed.
    let hash = 2166136261 ^ seed;
    for (let i = 0; i < label.length; i++) {
      hash = Math.imul(hash ^ label.charCodeAt(i), 16777619);
    }
    this.state = new Uint32Array([hash, seed, 0x9e3779b9, 1]);
    for (let i = 0; i < 16; i++) this.bits();
  }

  private bits(): number {
    const s = this.state;
    const a = s[0]!;
    const b = s[1]!;
    const c = s[2]!;
    const d = s[3]!;
    const sum = (a + b + d) >>> 0;
    s[3] = d + 1;
    s[0] = b ^ (b >>> 9);
    s[1] = c + (c << 3);
    s[2] = ((c << 21) | (c >>> 11)) + sum;
    return sum;
  }

  /** Uniform in [low, high). */
  uniform(low = 0, high = 1): number {
    return low + ((high - low) * this.bits()) / 4294967296;
  }

  /** Normal with the given mean and standard deviation (Box-Muller, one of the pair is used). */
  normal(mean = 0, sigma = 1): number {
    const u = (this.bits() + 1) / 4294967297;
    const v = this.bits() / 4294967296;
    return mean + sigma * Math.sqrt(-2 * Math.log(u)) * Math.cos(2 * Math.PI * v);
  }

  /** Normal cut at `limit` standard deviations by drawing again. */
  boundedNormal(sigma: number, limit = 2): number {
    for (;;) {
      const z = this.normal();
      if (Math.abs(z) <= limit) return sigma * z;
    }
  }

  clone(): RandomStream {
    const copy = new RandomStream(0, '');
    copy.state.set(this.state);
    return copy;
  }
}
