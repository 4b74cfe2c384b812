import { deflateSync, inflateSync } from 'node:zlib';
import type { ProfileView } from '../../core/estimate.js';
import type { Database } from './database.js';
import { type Chosen, chooseRows } from './spread.js';

/** Spacing of the profiles that are kept [ms]; the newest is held by the daemon itself. */
const EVERY_MS = 600_000;
/** Temperatures are kept to this part of a kelvin; finer digits would double the size. */
const PER_K = 1000;

/**
 * Temperature profiles with the readings they were estimated from, by unit and time: the first of each
 * 10 minutes of source time, counted from the full hour, deflated. What is kept tells which have theirs:
 * neither a restart nor a replay of the journal keeps more. Rows of older versions are JSON as it is.
 */
export class Profiles {
  constructor(private readonly database: Database) {}

  /** Keeps a profile if it is the first of its 10 minutes; with `always` this one in any case. */
  add(profile: ProfileView, always = false): void {
    const time_ms = Date.parse(profile.time);
    if (!always && this.hasOneWith(profile.unit, time_ms)) return;
    this.database
      .prepare('INSERT OR IGNORE INTO profiles (unit, time, json) VALUES (?, ?, ?)')
      .run(profile.unit, time_ms, packed(profile));
  }

  /** Puts a profile that was made again in the place of those of the rest of its 10 minutes. */
  revise(profile: ProfileView, from_ms: number): void {
    const time_ms = Date.parse(profile.time);
    const end = (Math.floor(time_ms / EVERY_MS) + 1) * EVERY_MS;
    this.database
      .prepare('DELETE FROM profiles WHERE unit = ? AND time >= ? AND time < ?')
      .run(profile.unit, from_ms, end);
    this.add(profile);
  }

  private hasOneWith(unit: string, time_ms: number): boolean {
    const from = Math.floor(time_ms / EVERY_MS) * EVERY_MS;
    const found = this.database
      .prepare('SELECT 1 FROM profiles WHERE unit = ? AND time BETWEEN ? AND ? LIMIT 1')
      .get(unit, from, from + EVERY_MS - 1);
    return found !== undefined;
  }

  latest(unit: string): ProfileView | null {
    return this.atOrBefore(unit, Number.MAX_SAFE_INTEGER);
  }

  atOrBefore(unit: string, time_ms: number): ProfileView | null {
    return this.one('unit = @unit AND time <= @time_ms ORDER BY time DESC', { unit, time_ms });
  }

  /** The profile that was kept nearest to a time, at most `within_ms` from it. */
  near(unit: string, time_ms: number, within_ms: number): ProfileView | null {
    return this.one('unit = @unit AND time BETWEEN @from AND @to ORDER BY abs(time - @time_ms)', {
      unit,
      time_ms,
      from: time_ms - within_ms,
      to: time_ms + within_ms,
    });
  }

  /** Profiles of a span of time, oldest first, at most `points`; see chooseRows. */
  spread(unit: string, from_ms: number, to_ms: number, points: number): Chosen<ProfileView> {
    const span = { from_ms, to_ms };
    const chosen = chooseRows(this.database, 'profiles', 'json', unit, span, points, EVERY_MS);
    return { ...chosen, rows: chosen.rows.map(({ content }) => unpacked(content)) };
  }

  private one(where: string, values: Record<string, unknown>): ProfileView | null {
    const content = this.database
      .prepare(`SELECT json FROM profiles WHERE ${where} LIMIT 1`)
      .pluck()
      .get(values) as string | Buffer | undefined;
    return content === undefined ? null : unpacked(content);
  }
}

function packed(profile: ProfileView): Buffer {
  const text = JSON.stringify(profile, (key, value: unknown) => {
    if (key === 'value_K' && typeof value === 'number') return rounded(value);
    if (!/^(temperature|sigma|mean)_K$/.test(key) || !Array.isArray(value)) return value;
    return value.map(rounded);
  });
  return deflateSync(text);
}

function rounded(value: number): number {
  return Math.round(value * PER_K) / PER_K;
}

function unpacked(content: string | Buffer): ProfileView {
  const text = typeof content === 'string' ? content : inflateSync(content).toString();
  return JSON.parse(text) as ProfileView;
}
