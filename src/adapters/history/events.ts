import type { WatchEvent } from '../../core/watch/event.js';
import type { Database } from './database.js';
import type { Sequence } from './sequence.js';

/** An alarm or alert that stands, or has returned and was not acknowledged (ISA-18.2, 2016). */
export interface Standing extends Omit<WatchEvent, 'transition'> {
  readonly state: 'unacknowledged' | 'acknowledged' | 'returned_unacknowledged';
  readonly acknowledged_by: string | null;
}

interface StandingRow {
  id: string;
  state: Standing['state'];
  acknowledged_by: string | null;
  json: string;
}

/** Alarms and alerts: all that ever happened, and what stands now with its acknowledgement. */
export class Events {
  constructor(
    private readonly database: Database,
    private readonly sequence: Sequence,
  ) {}

  /**
   * Enters an event and moves what stands by it.
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
      if (event.transition === 'raised') this.raise(event);
      else this.giveBack(event.id);
      return true;
    })();
  }

  /** false where no such event stands. What has returned is gone once it is acknowledged. */
  acknowledge(id: string, who: string, now_ms: number): boolean {
    const row = this.row(id);
    if (!row) return false;
    // An acknowledgement is a person's word: a power cut may not undo it.
    this.database.pragma('synchronous = FULL');
    try {
      this.database.transaction(() => {
        this.database
          .prepare('INSERT INTO acknowledgements (id, who, time) VALUES (?, ?, ?)')
          .run(id, who, now_ms);
        if (row.state === 'returned_unacknowledged') this.drop(id);
        else if (row.state === 'unacknowledged') {
          this.database
            .prepare("UPDATE standing SET state = 'acknowledged', acknowledged_by = ? WHERE id = ?")
            .run(who, id);
        }
      })();
    } finally {
      this.database.pragma('synchronous = NORMAL');
    }
    return true;
  }

  standing(unit?: string): Standing[] {
    const rows = this.database
      .prepare('SELECT id, state, acknowledged_by, json FROM standing WHERE ? IS NULL OR unit = ?')
      .all(unit ?? null, unit ?? null) as StandingRow[];
    return rows.map(({ state, acknowledged_by, json }) => {
      const { transition: _, ...event } = JSON.parse(json) as WatchEvent;
      return { ...event, state, acknowledged_by };
    });
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

  private raise(event: WatchEvent): void {
    this.database
      .prepare(
        `INSERT OR REPLACE INTO standing (id, unit, state, acknowledged_by, json)
         VALUES (?, ?, 'unacknowledged', NULL, ?)`,
      )
      .run(event.id, event.unit, JSON.stringify(event));
  }

  private giveBack(id: string): void {
    const row = this.row(id);
    if (row?.state === 'acknowledged') this.drop(id);
    else if (row) {
      this.database
        .prepare("UPDATE standing SET state = 'returned_unacknowledged' WHERE id = ?")
        .run(id);
    }
  }

  private drop(id: string): void {
    this.database.prepare('DELETE FROM standing WHERE id = ?').run(id);
  }

  private row(id: string): StandingRow | undefined {
    return this.database
      .prepare('SELECT id, state, acknowledged_by, json FROM standing WHERE id = ?')
      .get(id) as StandingRow | undefined;
  }
}
