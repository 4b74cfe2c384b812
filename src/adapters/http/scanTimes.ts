import { Histogram, Registry } from 'prom-client';

/**
 * How late scans are taken in: from the arrival of the reading, or of the deadline, that closed a scan
 * until its estimate is stored and told. What waits at the broker or for a deadline is not in it.
 */
export class ScanTimes {
  readonly registry = new Registry();
  private readonly lateness: Histogram;
  /** Of the newest scan, by unit [s]. */
  private readonly newest = new Map<string, number>();

  constructor() {
    this.lateness = new Histogram({
      name: 'rockhour_scan_lateness_seconds',
      help: 'From what closed a scan until its estimate is stored and told',
      buckets: [0.01, 0.03, 0.1, 0.3, 1, 3, 10, 30, 100, 300],
      registers: [this.registry],
    });
  }

  /** @param late_s [s]; a clock that was set back counts as none */
  observe(unit: string, late_s: number): void {
    const late = Math.max(0, late_s);
    this.newest.set(unit, late);
    this.lateness.observe(late);
  }

  /** Of the newest scan of a unit [s]; undefined before its first. */
  latest(unit: string): number | undefined {
    return this.newest.get(unit);
  }
}
