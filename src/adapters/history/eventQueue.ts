import type { ToldEvent } from '../../core/alarm/telling.js';
import type { Database } from './database.js';

/**
 * What is told outside, behind a named cursor, in the order in which it was made. A cursor that was
 * never there begins at the present: a new receiver is not told the whole history.
 */
export class EventQueue {
  private readonly name: string;

  constructor(
    private readonly opened: () => Database,
    receiver: string,
  ) {
    this.name = `events to ${receiver}`;
  }

  /** The database at hand: a damaged one is replaced while the daemon runs. */
  private get database(): Database {
    return this.opened();
  }

  /** To be called once the database is open. */
  start(): void {
    this.database
      .prepare('INSERT OR IGNORE INTO cursors (name, value) VALUES (?, ?)')
      .run(this.name, this.newest);
  }

  read(most: number): { seq: number; event: ToldEvent }[] {
    const rows = this.database
      .prepare('SELECT no, json FROM tellings WHERE no > ? ORDER BY no LIMIT ?')
      .all(this.cursor, most) as { no: number; json: string }[];
    return rows.map(({ no, json }) => ({ seq: no, event: JSON.parse(json) as ToldEvent }));
  }

  moveTo(seq: number): void {
    this.database
      .prepare('INSERT OR REPLACE INTO cursors (name, value) VALUES (?, ?)')
      .run(this.name, seq);
  }

  get backlog(): number {
    return this.database
      .prepare('SELECT count(*) FROM tellings WHERE no > ?')
      .pluck()
      .get(this.cursor) as number;
  }

  private get cursor(): number {
    const found = this.database.prepare('SELECT value FROM cursors WHERE name = ?').pluck();
    return (found.get(this.name) as number | undefined) ?? this.newest;
  }

  /** Number of the newest that ever was, be it deleted since. */
  private get newest(): number {
    const found = this.database
      .prepare("SELECT seq FROM sqlite_sequence WHERE name = 'tellings'")
      .pluck();
    return (found.get() as number | undefined) ?? 0;
  }
}
