import { withoutControls } from '../errors.js';
import type { Log } from '../log.js';

const WINDOW_MS = 60_000;

interface Kind {
  since: number;
  unsaid: number;
}

/** Log lines that could come by the thousand: one per kind and minute, with how many went unsaid. */
export class Notices {
  private readonly kinds = new Map<string, Kind>();

  constructor(private readonly log: Log) {}

  warn(kind: string, text: string): void {
    this.say('warn', kind, text);
  }

  info(kind: string, text: string): void {
    this.say('info', kind, text);
  }

  private say(level: 'warn' | 'info', kind: string, text: string): void {
    const now = performance.now();
    const known = this.kinds.get(kind);
    if (known && now - known.since < WINDOW_MS) {
      known.unsaid++;
      return;
    }
    const unsaid = known?.unsaid ?? 0;
    this.kinds.set(kind, { since: now, unsaid: 0 });
    // Texts carry what came over the network.
    this.log[level]({ kind, ...(unsaid > 0 ? { unsaid } : {}) }, withoutControls(text));
  }
}
