interface SeenReading {
  readonly unit: string;
  readonly channel: string;
  readonly time_ms: number;
  readonly value: number;
  readonly quality: string;
}

/** Kept of each channel at least [readings]. */
const DEPTH = 64;
interface Ring {
  times: Float64Array;
  values: Float64Array;
  /** Which reading of all channels it was. */
  numbers: Float64Array;
  qualities: string[];
  next: number;
}

/**
 * The last readings of each channel, to tell an exact copy (same source time, value and quality)
 * from news: "at least once" delivery brings copies, which carry nothing and are counted, not kept.
 */
export class RecentReadings {
  private readonly rings = new Map<string, Ring>();
  private count = 0;

  /**
   * @param window of the last so many readings of all channels together none is forgotten: all that a
   *   broker can have in flight when a connection or this process ends, committed but not acknowledged
   */
  constructor(private readonly window: number) {}

  /** True where this very reading is among the last of its channel; else it is remembered. */
  seen(reading: SeenReading): boolean {
    const key = `${reading.unit}\n${reading.channel}`;
    let ring = this.rings.get(key);
    if (!ring) {
      ring = emptyRing(DEPTH);
      this.rings.set(key, ring);
    }
    const { times, qualities, values } = ring;
    for (let i = 0; i < times.length; i++) {
      if (times[i] !== reading.time_ms || qualities[i] !== reading.quality) continue;
      if (Object.is(values[i], reading.value)) return true;
    }
    this.count++;
    // One channel alone that brings many at once has a longer memory from then on.
    if (this.count - ring.numbers[ring.next]! < this.window) grow(ring);
    ring.times[ring.next] = reading.time_ms;
    ring.values[ring.next] = reading.value;
    ring.numbers[ring.next] = this.count;
    ring.qualities[ring.next] = reading.quality;
    ring.next = (ring.next + 1) % ring.times.length;
    return false;
  }
}

function emptyRing(depth: number): Ring {
  return {
    times: new Float64Array(depth).fill(Number.NaN),
    values: new Float64Array(depth),
    numbers: new Float64Array(depth).fill(Number.NEGATIVE_INFINITY),
    qualities: new Array<string>(depth).fill(''),
    next: 0,
  };
}

/** Twice the room, the oldest first. */
function grow(ring: Ring): void {
  const depth = ring.times.length;
  const before = { ...ring };
  Object.assign(ring, emptyRing(2 * depth), { next: depth });
  for (let i = 0; i < depth; i++) {
    const from = (before.next + i) % depth;
    ring.times[i] = before.times[from]!;
    ring.values[i] = before.values[from]!;
    ring.numbers[i] = before.numbers[from]!;
    ring.qualities[i] = before.qualities[from]!;
  }
}
