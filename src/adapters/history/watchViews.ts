import { deflateSync, inflateSync } from 'node:zlib';
import { statesOf, type WatchView } from '../../core/watch/causes.js';
import type { Database } from './database.js';
import { type Chosen, chooseRows } from './spread.js';

/** Spacing of the views that are kept [ms], besides those in which an indicator changed its state. */
const EVERY_MS = 600_000;

/** What indicators showed, by unit and time: every 10 minutes of source time and at each change; deflated. */
export class WatchViews {
  private readonly due = new Map<string, number>();
  private readonly states = new Map<string, string>();

  constructor(private readonly database: Database) {}

  /** Keeps a view where it is due, or where an indicator has another state than in the last one given. */
  add(view: WatchView): void {
    const time_ms = Date.parse(view.time);
    const states = statesOf(view);
    const changed = this.statesBefore(view.unit) !== states;
    this.states.set(view.unit, states);
    if (!changed && time_ms < (this.due.get(view.unit) ?? Number.NEGATIVE_INFINITY)) return;
    this.due.set(view.unit, (Math.floor(time_ms / EVERY_MS) + 1) * EVERY_MS);
    this.database
      .prepare('INSERT OR IGNORE INTO watch (unit, time, content) VALUES (?, ?, ?)')
      .run(view.unit, time_ms, deflateSync(JSON.stringify(view)));
  }

  /** Deletes views of a span of time, which are made again. */
  forget(unit: string, from_ms: number, end_ms: number): void {
    this.database
      .prepare('DELETE FROM watch WHERE unit = ? AND time >= ? AND time < ?')
      .run(unit, from_ms, end_ms);
  }

  /** The next view is due, whatever was given before. */
  beginAnew(unit: string): void {
    this.due.delete(unit);
    this.states.delete(unit);
  }

  latest(unit: string): WatchView | null {
    const content = this.database
      .prepare('SELECT content FROM watch WHERE unit = ? ORDER BY time DESC LIMIT 1')
      .pluck()
      .get(unit) as Buffer | undefined;
    return content === undefined ? null : viewOf(content);
  }

  /** The newest of a span of time; null where it has none. */
  newestUntil(unit: string, from_ms: number, to_ms: number): WatchView | null {
    const content = this.database
      .prepare(
        'SELECT content FROM watch WHERE unit = ? AND time BETWEEN ? AND ? ORDER BY time DESC LIMIT 1',
      )
      .pluck()
      .get(unit, from_ms, to_ms) as Buffer | undefined;
    return content === undefined ? null : viewOf(content);
  }

  /** Views of a span of time, oldest first, at most `most`. */
  between(unit: string, from_ms: number, to_ms: number, most: number): WatchView[] {
    const rows = this.database
      .prepare(
        'SELECT content FROM watch WHERE unit = ? AND time BETWEEN ? AND ? ORDER BY time LIMIT ?',
      )
      .pluck()
      .all(unit, from_ms, to_ms, most) as Buffer[];
    return rows.map(viewOf);
  }

  /** Views of a span of time, oldest first, at most `points`; see chooseRows. */
  spread(unit: string, from_ms: number, to_ms: number, points: number): Chosen<WatchView> {
    const span = { from_ms, to_ms };
    const chosen = chooseRows(this.database, 'watch', 'content', unit, span, points, EVERY_MS);
    return { ...chosen, rows: chosen.rows.map(({ content }) => viewOf(content as Buffer)) };
  }

  private statesBefore(unit: string): string | null {
    const held = this.states.get(unit);
    if (held !== undefined) return held;
    const stored = this.latest(unit);
    return stored && statesOf(stored);
  }
}

function viewOf(content: Buffer): WatchView {
  return JSON.parse(inflateSync(content).toString()) as WatchView;
}
