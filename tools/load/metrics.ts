/** What a daemon's /metrics say at a moment. */
export class Metrics {
  private constructor(private readonly values: ReadonlyMap<string, number>) {}

  static async of(url: string): Promise<Metrics> {
    const text = await (await fetch(`${url}metrics`)).text();
    const values = new Map<string, number>();
    for (const line of text.split('\n')) {
      const at = line.lastIndexOf(' ');
      if (at > 0 && !line.startsWith('#'))
        values.set(line.slice(0, at), Number(line.slice(at + 1)));
    }
    return new Metrics(values);
  }

  /** A counter of the daemon by its own name. */
  counter(name: string): number {
    return this.get(`rockhour_${name}_total{counter="${name}"}`);
  }

  get resident_MB(): number {
    return this.get('process_resident_memory_bytes') / 1e6;
  }

  get heap_MB(): number {
    return this.get('nodejs_heap_size_used_bytes') / 1e6;
  }

  get backlog(): number {
    return this.get('rockhour_backlog{to="pipeline"}');
  }

  /** Scans by how late they were, so many up to each bound [s]. */
  get lateness(): Map<number, number> {
    const found = new Map<number, number>();
    for (const [key, value] of this.values) {
      const bound = /^rockhour_scan_lateness_seconds_bucket\{le="(.+)"\}$/.exec(key)?.[1];
      if (bound !== undefined) found.set(bound === '+Inf' ? Infinity : Number(bound), value);
    }
    return found;
  }

  private get(key: string): number {
    const value = this.values.get(key);
    if (value === undefined) throw new Error(`/metrics has no ${key}`);
    return value;
  }
}

/**
 * A quantile of a histogram's growth between two looks: the bound at or below which so many are,
 * drawn straight within its bucket.
 * @returns it and the upper bound of its bucket [s]
 */
export function quantile(
  before: ReadonlyMap<number, number>,
  after: ReadonlyMap<number, number>,
  share: number,
): { value: number; bound: number } {
  const bounds = [...after.keys()].sort((a, b) => a - b);
  const upTo = (bound: number) => after.get(bound)! - (before.get(bound) ?? 0);
  const wanted = share * upTo(bounds.at(-1)!);
  let low = 0;
  let below = 0;
  for (const bound of bounds) {
    const count = upTo(bound);
    if (count >= wanted && count > below) {
      const value =
        bound === Infinity ? low : low + ((wanted - below) / (count - below)) * (bound - low);
      return { value, bound };
    }
    low = bound;
    below = count;
  }
  return { value: Number.NaN, bound: Number.NaN };
}
