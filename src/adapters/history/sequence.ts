import type { Database } from './database.js';

/**
 * The common number of estimates, dispatch answers, events, cycles and withdrawals: `next` is the one to
 * be used next.
 */
export class Sequence {
  next: number;

  constructor(database: Database) {
    const newest = database
      .prepare(
        `SELECT max(n) FROM (SELECT max(seq) AS n FROM estimates UNION ALL
           SELECT max(seq) FROM dispatch UNION ALL SELECT max(seq) FROM events UNION ALL
           SELECT max(seq) FROM cycles UNION ALL SELECT max(seq) FROM withdrawals UNION ALL
           SELECT max(value) FROM cursors WHERE name = 'forwarded')`,
      )
      .pluck()
      .get() as number | null;
    this.next = (newest ?? 0) + 1;
  }
}
