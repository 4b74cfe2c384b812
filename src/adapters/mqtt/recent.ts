interface SeenReading {
  readonly unit: string;
  readonly channel: string;
  readonly time_ms: number;
  readonly value: number;
  readonly quality: string;
}

/**
 * Per channel [readings]. Copies come from what a broker had in flight when a connection or this
 * process ended: what was committed but not acknowledged, at most 50 ms of messages or one group.
 */
const DEPTH = 64;

interface Ring {
  readonly times: Float64Array;
  readonly values: Float64Array;
  readonly qualities: string[];
  next: number;
}

/**
 * The last readings of each channel, to tell an exact copy (same source time, value and quality)
 * from news: "at least once" delivery brings copies, which carry nothing and are counted, not kept.
 */
export class RecentReadings {
  private readonly rings = new Map<string, Ring>();

  /** True where this very reading is among the last of its channel; else it is remembered. */
  seen(reading: SeenReading): boolean {
    const key = `${reading.unit}\n${reading.channel}`;
    let ring = this.rings.get(key);
    if (!ring) {
      ring = {
        times: new Float64Array(DEPTH).fill(Number.NaN),
        values: new Float64Array(DEPTH),
        qualities: new Array<string>(DEPTH).fill(''),
        next: 0,
      };
      this.rings.set(key, ring);
    }
    for (let i = 0; i < DEPTH; i++) {
      if (ring.times[i] !== reading.time_ms || ring.qualities[i] !== reading.quality) continue;
      if (Object.is(ring.values[i], reading.value)) return true;
    }
    ring.times[ring.next] = reading.time_ms;
    ring.values[ring.next] = reading.value;
    ring.qualities[ring.next] = reading.quality;
    ring.next = (ring.next + 1) % DEPTH;
    return false;
  }
}
