import type { WatchEvent } from '../../core/watch/event.js';
import type { Database } from './database.js';
import type { Sequence } from './sequence.js';

/**
 * Events behind a named cursor, in the order in which they were made. A cursor that was never there
 * begins at the present: a new receiver is not told the whole history.
 */
export class EventQueue {
  private readonly name: string;

  constructor(
    private readonly database: Database,
    private readonly sequence: Sequence,
    receiver: string,
  ) {
    this.name = `events to ${receiver}`;
  }

  /** To be called once the database is open. */
  start(): void {
    this.database
      .prepare('INSERT OR IGNORE INTO cursors (name, value) VALUES (?, ?)')
      .run(this.name, this.sequence.next - 1);
  }

  read(most: number): { seq: number; event: WatchEvent }[] {
    const rows = this.database
      .prepare('SELECT seq, json FROM events WHERE seq > ? ORDER BY seq LIMIT ?')
      .all(this.cursor, most) as { seq: number; json: string }[];
    return rows.map(({ seq, json }) => ({ seq, event: JSON.parse(json) as WatchEvent }));
  }

  moveTo(seq: number): void {
    this.database
      .prepare('INSERT OR REPLACE INTO cursors (name, value) VALUES (?, ?)')
      .run(this.name, seq);
  }

  get backlog(): number {
    return this.database
      .prepare('SELECT count(*) FROM events WHERE seq > ?')
      .pluck()
      .get(this.cursor) as number;
  }

  private get cursor(): number {
    const found = this.database.prepare('SELECT value FROM cursors WHERE name = ?').pluck();
    return (found.get(this.name) as number | undefined) ?? this.sequence.next - 1;
  }
}
