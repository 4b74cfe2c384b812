import { DateTime } from 'luxon';
import type { ConnectionDefinition, LimitsDefinition } from '../definitions.js';
import type { Ceiling } from './leg.js';

const DAY_MIN = 1440;

/**
 * What connection and outages leave between two times: limits by the time of day are those of the
 * connection's own time zone, on days of 23, 24 and 25 hours alike.
 *
 * @param from_ms, to_ms epoch; times of the answer are seconds from `from_ms`
 */
export function ceilingsBetween(
  limits: LimitsDefinition,
  from_ms: number,
  to_ms: number,
): Ceiling[] {
  const at = (ms: number): number => (ms - from_ms) / 1000;
  const found: Ceiling[] = (limits.outages ?? [])
    .filter((outage) => outage.to_ms > from_ms && outage.from_ms < to_ms)
    .map((outage) => ({
      from_s: at(outage.from_ms),
      to_s: at(outage.to_ms),
      charge_max_W: outage.charge_max_W,
      discharge_max_W: outage.discharge_max_W,
      cause: 'outage' as const,
    }));
  const { connection } = limits;
  if (connection === undefined) return found;
  found.push({
    from_s: Number.NEGATIVE_INFINITY,
    to_s: Number.POSITIVE_INFINITY,
    charge_max_W: connection.import_max_W,
    discharge_max_W: connection.export_max_W,
    cause: 'connection',
  });
  for (const window of windowsBetween(connection, from_ms, to_ms)) {
    found.push({ ...window, from_s: at(window.from_s), to_s: at(window.to_s) });
  }
  return found;
}

/** Windows of all local days that touch the time asked about; their times are epoch [ms] here. */
function windowsBetween(
  connection: ConnectionDefinition,
  from_ms: number,
  to_ms: number,
): Ceiling[] {
  if (connection.windows.length === 0) return [];
  const zone = connection.time_zone;
  const found: Ceiling[] = [];
  // From the day before: a window may run over midnight.
  let day = DateTime.fromMillis(from_ms, { zone }).startOf('day').minus({ days: 1 });
  for (; day.toMillis() < to_ms; day = day.plus({ days: 1 }).startOf('day')) {
    for (const window of connection.windows) {
      const over = window.to_min <= window.from_min;
      const begins = clock(day, window.from_min, 'first');
      const ends = clock(over ? day.plus({ days: 1 }) : day, window.to_min, 'last');
      if (ends <= from_ms || begins >= to_ms || ends <= begins) continue;
      found.push({
        from_s: begins,
        to_s: ends,
        charge_max_W: window.import_max_W,
        discharge_max_W: window.export_max_W,
        cause: 'connection',
      });
    }
  }
  return found;
}

/**
 * Epoch [ms] at which the clocks of a day show so many minutes after midnight; 1440 = its end. Where
 * they pass over that, when they do; where they show it twice, the one that makes a window the longer,
 * so that no hour of it is missed.
 */
function clock(day: DateTime, minutes: number, which: 'first' | 'last'): number {
  if (minutes >= DAY_MIN) return day.plus({ days: 1 }).startOf('day').toMillis();
  const hour = Math.floor(minutes / 60);
  const minute = minutes % 60;
  const shown = day.set({ hour, minute });
  if (shown.hour !== hour || shown.minute !== minute) return changeBefore(shown);
  const both = shown.getPossibleOffsets().map((one) => one.toMillis());
  return which === 'first' ? Math.min(...both) : Math.max(...both);
}

/** The last change of the clocks before a time that one has moved, within a day [epoch ms]. */
function changeBefore(moved: DateTime): number {
  const offsetAt = (ms: number) => DateTime.fromMillis(ms, { zone: moved.zone }).offset;
  let after = moved.toMillis();
  let before = after - DAY_MIN * 60_000;
  while (after - before > 1) {
    const middle = Math.floor((before + after) / 2);
    if (offsetAt(middle) === moved.offset) after = middle;
    else before = middle;
  }
  return after;
}
