/** Addresses that are remembered; of more the one that failed longest ago is forgotten. */
const MOST_ADDRESSES = 1000;

interface Window {
  begin_ms: number;
  failures: number;
}

/**
 * Counts log-ins that failed, per address and minute, in bounded memory. Beyond the limit they are
 * answered shortly; a right token is never turned away for the wrong ones of its neighbours, who
 * may share an address behind a proxy. 256 bits cannot be guessed at any rate.
 */
export class LoginFailures {
  private readonly windows = new Map<string, Window>();
  total = 0;

  constructor(
    private readonly most_per_min: number,
    private readonly now: () => number = () => performance.now(),
  ) {}

  get addresses(): number {
    return this.windows.size;
  }

  /** Counts one. @returns seconds until it may be tried again; 0 below the limit */
  add(address: string): number {
    this.total += 1;
    const now_ms = this.now();
    const before = this.windows.get(address);
    const isOld = before === undefined || now_ms - before.begin_ms >= 60_000;
    const window = isOld ? { begin_ms: now_ms, failures: 0 } : before;
    window.failures += 1;
    // To the end of the map, which keeps its order: the first one is the one to be forgotten.
    this.windows.delete(address);
    this.windows.set(address, window);
    if (this.windows.size > MOST_ADDRESSES) {
      this.windows.delete(this.windows.keys().next().value as string);
    }
    if (window.failures <= this.most_per_min) return 0;
    return Math.max(1, Math.ceil((window.begin_ms + 60_000 - now_ms) / 1000));
  }
}
