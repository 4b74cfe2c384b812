import { withoutControls } from '../errors.js';
import type { Log } from '../log.js';

const WINDOW_MS = 60_000;

type Level = 'warn' | 'info';

interface Kind {
  readonly since: number;
  unsaid: number;
  /** The newest that went unsaid. */
  last: { readonly level: Level; readonly text: string; readonly came: string } | null;
  /** Ends the minute where something went unsaid. */
  timer: NodeJS.Timeout | null;
}

/**
 * Log lines that could come by the thousand: one per kind and minute at once, and of those that went
 * unsaid the newest when the minute is over, with how many there were and when it `came`: how it
 * stands is always told.
 */
export class Notices {
  private readonly kinds = new Map<string, Kind>();

  constructor(private readonly log: Log) {}

  warn(kind: string, text: string): void {
    this.say('warn', kind, text);
  }

  info(kind: string, text: string): void {
    this.say('info', kind, text);
  }

  /** What is still unsaid is said. */
  stop(): void {
    for (const kind of [...this.kinds.keys()]) this.close(kind);
  }

  private say(level: Level, kind: string, text: string): void {
    const now = performance.now();
    const known = this.kinds.get(kind);
    if (known && now - known.since < WINDOW_MS) {
      known.unsaid++;
      known.last = { level, text, came: new Date().toISOString() };
      known.timer ??= setTimeout(() => this.close(kind), WINDOW_MS - (now - known.since)).unref();
      return;
    }
    this.close(kind);
    this.write(level, kind, text);
  }

  /** Ends a kind's minute: the newest that went unsaid is said, and begins the next. */
  private close(kind: string): void {
    const known = this.kinds.get(kind);
    this.kinds.delete(kind);
    if (!known?.last) return;
    if (known.timer) clearTimeout(known.timer);
    const { level, text, came } = known.last;
    this.write(level, kind, text, {
      came,
      ...(known.unsaid > 1 ? { unsaid: known.unsaid - 1 } : {}),
    });
  }

  private write(level: Level, kind: string, text: string, more: object = {}): void {
    this.kinds.set(kind, { since: performance.now(), unsaid: 0, last: null, timer: null });
    // Texts carry what came over the network.
    this.log[level]({ kind, ...more }, withoutControls(text));
  }
}
