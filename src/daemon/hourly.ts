import { QUALITIES } from '../core/estimate.js';
import type { Log } from '../log.js';
import type { DaemonClock } from './clock.js';
import type { CounterName, Counters } from './counters.js';

/** What an hour's line tells of, each as what came in that hour. */
const TOLD = [
  'scans',
  'scans_deadline',
  'scan_failures',
  'messages',
  'readings',
  'late',
  'malformed',
  'journal_failures',
  'history_failures',
  'events',
] as const satisfies readonly CounterName[];
type Told = (typeof TOLD)[number];

export interface HourlyOptions {
  readonly log: Log;
  readonly clock: DaemonClock;
  readonly counters: Counters;
  /** Quality of each unit's newest estimate; null before its first. */
  qualities(): readonly (string | null)[];
  /** Alarms and alerts in the list. */
  standing(): number;
  backlogs(): Readonly<Record<string, number>>;
}

const HOUR_MS = 3_600_000;

/** One line in the log an hour (of plant time): whether all went its way, in a few figures. */
export class Hourly {
  private timer: NodeJS.Timeout | null = null;
  private before: Record<Told, number> | null = null;

  constructor(private readonly options: HourlyOptions) {}

  start(): void {
    this.before = this.counts();
    const every_ms = HOUR_MS / Math.max(1, this.options.clock.speed);
    this.timer = setInterval(() => this.tell(), every_ms);
    this.timer.unref();
  }

  stop(): void {
    if (this.timer) clearInterval(this.timer);
    this.timer = null;
  }

  /** Writes the line of what came since the last, or since the start. */
  tell(): void {
    const { log, qualities, standing, backlogs } = this.options;
    const now = this.counts();
    const before = this.before ?? now;
    this.before = now;
    const hour = Object.fromEntries(TOLD.map((name) => [name, now[name] - before[name]])) as Record<
      Told,
      number
    >;
    const units = qualities();
    const of = (quality: string | null) => units.filter((one) => one === quality).length;
    const stand = [...QUALITIES, null]
      .map((quality) => [quality ?? 'not begun', of(quality)] as const)
      .filter(([, count]) => count > 0)
      .map(([quality, count]) => `${count} ${quality}`)
      .join(', ');
    const waiting = Object.values(backlogs()).reduce((sum, count) => sum + count, 0);
    const memory_MB = Math.round(process.memoryUsage().rss / 1e6);
    const failed = hour.scan_failures + hour.journal_failures + hour.history_failures;
    log.info(
      { kind: 'hour', ...hour, waiting, standing: standing(), memory_MB },
      `last hour: ${hour.scans} scans of ${units.length} units (${stand}) from ${hour.readings} readings, ` +
        `${hour.late} late, ${hour.malformed} malformed, ${failed} failures; ${hour.events} events, ` +
        `${standing()} alarms and alerts stand; ${waiting} entries wait; ${memory_MB} MB`,
    );
  }

  private counts(): Record<Told, number> {
    const { counters } = this.options;
    return Object.fromEntries(TOLD.map((name) => [name, counters.get(name)])) as Record<
      Told,
      number
    >;
  }
}
