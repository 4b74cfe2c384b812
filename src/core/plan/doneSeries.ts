import { type DoneRow, GAP_MS } from './discharges.js';
import type { PlannedLeg } from './offerAsk.js';

/** A leg is followed where power is within so much of it. */
const LEG_WITHIN = 0.1;

/**
 * Stored scans, summed up once so that what a unit did in any time is had without going through them
 * again: many offers are held against the same scans.
 */
export class DoneSeries {
  /** Of the rows before each: those that stood, and gaps longer than `GAP_MS` between two. */
  private readonly stands: Uint32Array;
  private readonly gaps: Uint32Array;
  private readonly runs = new Map<string, number>();

  /** @param rows ascending in time */
  constructor(private readonly rows: readonly DoneRow[]) {
    this.stands = new Uint32Array(rows.length + 1);
    this.gaps = new Uint32Array(rows.length + 1);
    rows.forEach((row, i) => {
      const before = rows[i - 1]?.time_ms ?? row.time_ms;
      this.stands[i + 1] = (this.stands[i] as number) + (row.mode === 'stand' ? 1 : 0);
      this.gaps[i + 1] = (this.gaps[i] as number) + (row.time_ms - before > GAP_MS ? 1 : 0);
    });
  }

  /** Time of the last scan; -Infinity = there is none. */
  get last_ms(): number {
    return this.rows[this.rows.length - 1]?.time_ms ?? Number.NEGATIVE_INFINITY;
  }

  /** Whether there is no time longer than `GAP_MS` without a scan after `from_ms` and before `to_ms`. */
  isWhole(from_ms: number, to_ms: number): boolean {
    const low = this.firstFrom(from_ms + 1);
    const high = this.firstFrom(to_ms);
    if (low >= high) return to_ms - from_ms <= GAP_MS;
    const first = (this.rows[low] as DoneRow).time_ms;
    const last = (this.rows[high - 1] as DoneRow).time_ms;
    if (first - from_ms > GAP_MS || to_ms - last > GAP_MS) return false;
    return this.gaps[high] === this.gaps[low + 1];
  }

  /** Scans from one time to another, both included. */
  scans(from_ms: number, to_ms: number): number {
    return Math.max(0, this.firstFrom(to_ms + 1) - this.firstFrom(from_ms));
  }

  /** Those of them in which the unit stood. */
  stood(from_ms: number, to_ms: number): number {
    const [low, high] = [this.firstFrom(from_ms), this.firstFrom(to_ms + 1)];
    return high <= low ? 0 : (this.stands[high] as number) - (this.stands[low] as number);
  }

  /** Those in which it ran as a leg says, its power within 10 %. */
  ran({ mode, power_W }: PlannedLeg, from_ms: number, to_ms: number): number {
    const [low, high] = [this.firstFrom(from_ms), this.firstFrom(to_ms + 1)];
    const key = `${mode} ${power_W} ${low} ${high}`;
    const known = this.runs.get(key);
    if (known !== undefined) return known;
    let count = 0;
    for (let i = low; i < high; i++) {
      const row = this.rows[i] as DoneRow;
      const share = Math.abs(row.given_MW_el) / (power_W / 1e6);
      if (row.mode === mode && Math.abs(share - 1) <= LEG_WITHIN) count++;
    }
    this.runs.set(key, count);
    return count;
  }

  /** Index of the first row at or after a time. */
  private firstFrom(time_ms: number): number {
    let low = 0;
    let high = this.rows.length;
    while (low < high) {
      const middle = (low + high) >> 1;
      if ((this.rows[middle] as DoneRow).time_ms < time_ms) low = middle + 1;
      else high = middle;
    }
    return low;
  }
}
