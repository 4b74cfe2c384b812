/**
 * The plant's clock as far as it can be known from its readings: the newest source time seen, plus
 * the time that has passed since on a clock of this machine that only counts forward. A plant whose
 * clock is wrong, or whose readings come from a store of hours ago, is therefore never hurried, and
 * a silent plant still sees its scans close. Used for deadlines only; no estimate depends on it.
 */
export class PlantClock {
  private newest_ms: number | null = null;
  private seen_at_ms = 0;

  /** Takes in a reading's source time, seen when the steady clock showed `steady_ms`. */
  observe(source_ms: number, steady_ms: number): void {
    if (this.newest_ms !== null && source_ms <= this.newest_ms) return;
    this.newest_ms = source_ms;
    this.seen_at_ms = steady_ms;
  }

  /** All that was seen was of clocks that were wrong. */
  restart(): void {
    this.newest_ms = null;
  }

  /** The plant's time when the steady clock shows `steady_ms`; null before the first reading. */
  at(steady_ms: number): number | null {
    if (this.newest_ms === null) return null;
    return this.newest_ms + Math.max(0, steady_ms - this.seen_at_ms);
  }
}
