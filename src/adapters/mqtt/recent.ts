import type { Quality } from './payload.js';

interface SeenReading {
  readonly unit: string;
  readonly channel: string;
  readonly time_ms: number;
  readonly value: number;
  readonly quality: Quality;
}

/** Kept of each channel at least [readings]. */
const DEPTH = 64;
/** Columns of a reading in a ring: source time, value, which reading of all channels it was, quality. */
const COLUMNS = 4;
const NUMBER = 2;

/** One array: there are as many rings as channels, ten thousands at a large site. */
interface Ring {
  readings: Float64Array;
  /** Row of the oldest. */
  next: number;
}

/**
 * The last readings of each channel, to tell an exact copy (same source time, value and quality)
 * from news: "at least once" delivery brings copies, which carry nothing and are counted, not kept.
 */
export class RecentReadings {
  private readonly rings = new Map<string, Ring>();
  private readonly qualities: Quality[] = [];
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
    const quality = this.codeOf(reading.quality);
    const { readings } = ring;
    for (let at = 0; at < readings.length; at += COLUMNS) {
      if (readings[at] !== reading.time_ms || readings[at + 3] !== quality) continue;
      if (Object.is(readings[at + 1], reading.value)) return true;
    }
    this.count++;
    // One channel alone that brings many at once has a longer memory from then on.
    if (this.count - readings[ring.next * COLUMNS + NUMBER]! < this.window) grow(ring);
    ring.readings.set([reading.time_ms, reading.value, this.count, quality], ring.next * COLUMNS);
    ring.next = (ring.next + 1) % (ring.readings.length / COLUMNS);
    return false;
  }

  /** Number of a quality: there are a few. */
  private codeOf(quality: Quality): number {
    const code = this.qualities.indexOf(quality);
    return code >= 0 ? code : this.qualities.push(quality) - 1;
  }
}

function emptyRing(depth: number): Ring {
  const readings = new Float64Array(depth * COLUMNS).fill(Number.NaN);
  for (let row = 0; row < depth; row++) {
    readings[row * COLUMNS + NUMBER] = Number.NEGATIVE_INFINITY;
  }
  return { readings, next: 0 };
}

/** Twice the room, the oldest first. */
function grow(ring: Ring): void {
  const { readings, next } = ring;
  const depth = readings.length / COLUMNS;
  const larger = emptyRing(2 * depth);
  larger.readings.set(readings.subarray(next * COLUMNS));
  larger.readings.set(readings.subarray(0, next * COLUMNS), (depth - next) * COLUMNS);
  Object.assign(ring, larger, { next: depth });
}
