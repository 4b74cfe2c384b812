import type { WatchEvent } from '../../core/watch/event.js';
import type { Alarms } from './alarms.js';
import type { Database } from './database.js';
import type { Sequence } from './sequence.js';

/** Conditions raised and returned: all that ever happened, each moving its alarm on. */
export class Events {
  constructor(
    private readonly database: Database,
    private readonly sequence: Sequence,
    private readonly alarms: Alarms,
  ) {}

  /**
   * Enters an event and moves its alarm on by it.
   * @returns false where this very event is known, as after a restart that replays the journal
   */
  add(event: WatchEvent): boolean {
    return this.database.transaction(() => {
      const known = this.database
        .prepare(
          'INSERT OR IGNORE INTO events (seq, unit, id, time, transition, json) VALUES (?, ?, ?, ?, ?, ?)',
        )
        .run(
          ...[this.sequence.next, event.unit, event.id, Date.parse(event.time)],
          ...[event.transition, JSON.stringify(event)],
        );
      if (known.changes === 0) return false;
      this.sequence.next++;
      this.alarms.take(event);
      return true;
    })();
  }

  /** Events of a span of time, newest first, at most `most`. */
  between(unit: string | undefined, from_ms: number, to_ms: number, most: number): WatchEvent[] {
    const rows = this.database
      .prepare(
        `SELECT json FROM events WHERE time BETWEEN ? AND ? AND (? IS NULL OR unit = ?)
         ORDER BY time DESC, seq DESC LIMIT ?`,
      )
      .pluck()
      .all(from_ms, to_ms, unit ?? null, unit ?? null, most) as string[];
    return rows.map((json) => JSON.parse(json) as WatchEvent);
  }
}
