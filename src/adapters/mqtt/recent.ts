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
  /** Newest source time there ever was: what is newer is no copy. */
  newest_ms: number;
}

/**
 * The last readings of each channel, to tell an exact copy (same source time, value and quality)
 * from news: "at least once" delivery brings copies, which carry nothing and are counted, not kept.
 */
export class RecentReadings {
  /** By unit and channel. */
  private readonly rings = new Map<string, Map<string, Ring>>();
  private readonly qualities: Quality[] = [];
  private count = 0;

  /**
   * @param window of the last so many readings of all channels together none is forgotten: all that a
   *   broker can have in flight when a connection or this process ends, committed but not acknowledged
   */
  constructor(private readonly window: number) {}

  /** True where this very reading is among the last of its channel; else it is remembered. */
  seen(reading: SeenReading): boolean {
    const ring = this.rings.get(reading.unit)?.get(reading.channel) ?? this.newRing(reading);
    const { time_ms, value } = reading;
    const quality = this.codeOf(reading.quality);
    if (time_ms <= ring.newest_ms && holds(ring, time_ms, value, quality)) return true;
    ring.newest_ms = Math.max(ring.newest_ms, time_ms);
    this.count++;
    // One channel alone that brings many at once has a longer memory from then on.
    if (this.count - ring.readings[ring.next * COLUMNS + NUMBER]! < this.window) grow(ring);
    const row = ring.next * COLUMNS;
    ring.readings[row] = time_ms;
    ring.readings[row + 1] = value;
    ring.readings[row + NUMBER] = this.count;
    ring.readings[row + 3] = quality;
    ring.next = (ring.next + 1) % (ring.readings.length / COLUMNS);
    return false;
  }

  private newRing({ unit, channel }: SeenReading): Ring {
    const ring = emptyRing(DEPTH);
    const own = this.rings.get(unit) ?? new Map<string, Ring>();
    own.set(channel, ring);
    this.rings.set(unit, own);
    return ring;
  }

  /** Number of a quality: there are a few. */
  private codeOf(quality: Quality): number {
    const code = this.qualities.indexOf(quality);
    return code >= 0 ? code : this.qualities.push(quality) - 1;
  }
}

function holds({ readings }: Ring, time_ms: number, value: number, quality: number): boolean {
  for (let at = 0; at < readings.length; at += COLUMNS) {
    if (readings[at] !== time_ms || readings[at + 3] !== quality) continue;
    if (Object.is(readings[at + 1], value)) return true;
  }
  return false;
}

function emptyRing(depth: number): Ring {
  const readings = new Float64Array(depth * COLUMNS).fill(Number.NaN);
  for (let row = 0; row < depth; row++) {
    readings[row * COLUMNS + NUMBER] = Number.NEGATIVE_INFINITY;
  }
  return { readings, next: 0, newest_ms: Number.NEGATIVE_INFINITY };
}

/** Twice the room, the oldest first. */
function grow(ring: Ring): void {
  const { readings, next, newest_ms } = ring;
  const depth = readings.length / COLUMNS;
  const larger = emptyRing(2 * depth);
  larger.readings.set(readings.subarray(next * COLUMNS));
  larger.readings.set(readings.subarray(0, next * COLUMNS), (depth - next) * COLUMNS);
  Object.assign(ring, larger, { next: depth, newest_ms });
}
