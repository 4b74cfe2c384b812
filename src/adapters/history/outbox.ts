import type { DispatchAnswer, Estimate } from '../../core/estimate.js';
import type { CycleRecord } from '../../core/watch/cycleRecord.js';
import type { WatchEvent } from '../../core/watch/event.js';
import type { Database } from './database.js';

/** What is due to the time-series database, in the order in which it was made. */
export type OutboxItem =
  | {
      readonly kind: 'estimate';
      readonly seq: number;
      readonly time_ms: number;
      readonly content: Estimate;
    }
  | {
      readonly kind: 'dispatch';
      readonly seq: number;
      readonly time_ms: number;
      readonly unit: string;
      readonly content: DispatchAnswer[];
    }
  | {
      readonly kind: 'event';
      readonly seq: number;
      readonly time_ms: number;
      readonly content: WatchEvent;
    }
  | {
      readonly kind: 'cycle';
      readonly seq: number;
      /** The end of the run. */
      readonly time_ms: number;
      readonly content: CycleRecord;
    }
  | Withdrawal;

/** What was forwarded of a unit's scans in a span is void: what holds there follows. */
export interface Withdrawal {
  readonly kind: 'withdrawal';
  readonly seq: number;
  readonly unit: string;
  readonly time_ms: number;
  /** ISO 8601 UTC, both within the span. */
  readonly content: { readonly from: string; readonly to: string };
}

interface Row {
  kind: OutboxItem['kind'];
  seq: number;
  unit: string;
  time: number;
  json: string;
}

/** The cursor of the forwarder and what lies behind it. */
export class Outbox {
  constructor(private readonly database: Database) {}

  /** Everything up to this number has been taken over by the other side. */
  get cursor(): number {
    const value = this.database.prepare("SELECT value FROM cursors WHERE name = 'forwarded'");
    return (value.pluck().get() as number | undefined) ?? 0;
  }

  moveTo(seq: number): void {
    this.database
      .prepare("INSERT OR REPLACE INTO cursors (name, value) VALUES ('forwarded', ?)")
      .run(seq);
  }

  /** Items after the cursor, oldest first, at most `most`. */
  read(most: number): OutboxItem[] {
    const { cursor } = this;
    const part = (kind: string, table: string) =>
      `SELECT * FROM (SELECT '${kind}' AS kind, seq, unit, time, json FROM ${table}
         WHERE seq > @cursor ORDER BY seq LIMIT @most)`;
    const rows = this.database
      .prepare(
        `${part('estimate', 'estimates')} UNION ALL ${part('dispatch', 'dispatch')}
         UNION ALL ${part('event', 'events')}
         UNION ALL ${part('cycle', 'cycles')} UNION ALL ${part('withdrawal', 'withdrawals')}
         ORDER BY seq LIMIT @most`,
      )
      .all({ cursor, most }) as Row[];
    return rows.map(
      ({ kind, seq, unit, time, json }) =>
        ({ kind, seq, unit, time_ms: time, content: JSON.parse(json) }) as OutboxItem,
    );
  }

  /** Items that wait. */
  get backlog(): number {
    return this.database
      .prepare(
        `SELECT (SELECT count(*) FROM estimates WHERE seq > @cursor)
           + (SELECT count(*) FROM dispatch WHERE seq > @cursor)
           + (SELECT count(*) FROM events WHERE seq > @cursor)
           + (SELECT count(*) FROM cycles WHERE seq > @cursor)
           + (SELECT count(*) FROM withdrawals WHERE seq > @cursor)`,
      )
      .pluck()
      .get({ cursor: this.cursor }) as number;
  }
}
