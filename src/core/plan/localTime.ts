import { DateTime, IANAZone } from 'luxon';

/** Between two instants [ms since 1970-01-01T00:00:00Z]. */
export interface Span {
  readonly from_ms: number;
  readonly to_ms: number;
}

/** A time as an instant, or why it is none and what would be right. */
export type Instant = { readonly ms: number } | { readonly expected: string };

/** Lengths into which a local day can be cut [min]. */
export const BLOCK_MINUTES = [15, 30, 60] as const;
export type BlockMinutes = (typeof BLOCK_MINUTES)[number];

const WRITTEN =
  /^(\d{4})-(\d\d)-(\d\d)[Tt ](\d\d):(\d\d)(?::(\d\d)(?:[.,](\d{1,9}))?)?\s?([Zz]|[+-]\d\d:?\d\d)?$/;
const DATE = /^(\d{4})-(\d\d)-(\d\d)$/;

/** Answers of `isTimeZone`: one costs as much as some steps of a march. */
const asked = new Map<string, boolean>();

/** Whether this is a name of the IANA time zone database, such as Europe/Paris or Etc/UTC. */
export function isTimeZone(zone: string): boolean {
  const known = asked.get(zone) ?? IANAZone.isValidZone(zone);
  // Names come from outside: not without end.
  if (asked.size < 1000) asked.set(zone, known);
  return known;
}

/**
 * The instant of a time in ISO 8601. With an offset (or Z) the offset counts and the zone does not
 * matter; without one it is local time of the zone. A local time that a change of the clocks leaves
 * out, or shows twice, is none: only its writer knows what was meant.
 *
 * @param zone IANA name, for times without an offset; null = there is none, an offset is needed
 * @throws RangeError for a zone that is not in the database
 */
export function instantOf(text: string, zone: string | null): Instant {
  const match = WRITTEN.exec(text.trim());
  const written = 'a time in ISO 8601 with offset, as in 2026-03-28T17:00+01:00';
  if (match === null) return { expected: written };
  const [year, month, day, hour, minute, second] = [1, 2, 3, 4, 5, 6].map((i) =>
    Number(match[i] ?? 0),
  ) as [number, number, number, number, number, number];
  const millisecond = Math.floor(Number(`0.${match[7] ?? '0'}`) * 1000);
  const parts = { year, month, day, hour, minute, second, millisecond };
  const utc = DateTime.fromObject(parts, { zone: 'utc' });
  if (!utc.isValid || hour > 23) return { expected: `${written}, of a day and time that exist` };
  const offset = match[8];
  if (offset !== undefined) {
    const minutes = offsetMinutes(offset);
    if (minutes === null) return { expected: `${written}, its offset within 18 hours` };
    return { ms: utc.toMillis() - minutes * 60_000 };
  }
  if (zone === null) return { expected: `${written}, or a time zone for local times` };
  const local = DateTime.fromObject(parts, { zone: zoneOf(zone) });
  const both = local.getPossibleOffsets().map((one) => one.toMillis());
  if (local.hour !== hour || local.minute !== minute || local.day !== day) {
    const moved = local.toISO({ suppressMilliseconds: true });
    return {
      expected: `a time that exists in ${zone}: the clocks go forward over it; with offset, as in ${moved}`,
    };
  }
  if (both.length > 1) {
    const [first, second_] = both
      .sort((a, b) => a - b)
      .map((ms) => DateTime.fromMillis(ms, { zone }).toISO({ suppressMilliseconds: true }));
    return {
      expected: `an offset, since the clocks of ${zone} show this time twice: ${first} or ${second_}`,
    };
  }
  return { ms: local.toMillis() };
}

/** Minutes of +hh:mm, -hhmm or Z; null beyond 18 hours, where no place on Earth is. */
function offsetMinutes(offset: string): number | null {
  if (/^z$/i.test(offset)) return 0;
  const digits = offset.replace(':', '');
  const minutes = Number(digits.slice(1, 3)) * 60 + Number(digits.slice(3, 5));
  if (minutes > 18 * 60 || Number(digits.slice(3, 5)) > 59) return null;
  return digits.startsWith('-') ? -minutes : minutes;
}

function zoneOf(zone: string): string {
  if (isTimeZone(zone)) return zone;
  throw new RangeError(
    `zone = ${JSON.stringify(zone)}: expected an IANA time zone such as Europe/Paris`,
  );
}

/**
 * A local day cut into blocks of equal length from its first instant on: 92, 96 or 100
 * quarter-hours, as the clocks change. Where a day is no whole number of blocks (clocks that change
 * by half an hour) the last block is shorter.
 *
 * @param date local calendar day, YYYY-MM-DD
 * @param zone IANA name
 * @throws RangeError for a day or zone that does not exist, or other minutes
 */
export function blocksOfDay(date: string, zone: string, minutes: BlockMinutes): Span[] {
  if (!BLOCK_MINUTES.includes(minutes)) {
    throw new RangeError(`minutes = ${minutes}: expected one of ${BLOCK_MINUTES.join(', ')}`);
  }
  const [, year, month, day] = (DATE.exec(date) ?? []).map(Number);
  const noon = DateTime.fromObject(
    { year: year ?? 0, month: month ?? 0, day: day ?? 0, hour: 12 },
    { zone: zoneOf(zone) },
  );
  if (!noon.isValid) {
    throw new RangeError(`date = ${JSON.stringify(date)}: expected a day as in 2026-03-29`);
  }
  const begins = noon.startOf('day').toMillis();
  const ends = noon.plus({ days: 1 }).startOf('day').toMillis();
  return cut({ from_ms: begins, to_ms: ends }, minutes);
}

/** A span cut into blocks from its beginning; what is left over is a shorter block. */
export function cut(span: Span, minutes: number): Span[] {
  const length = minutes * 60_000;
  const count = Math.max(0, Math.ceil((span.to_ms - span.from_ms) / length));
  return Array.from({ length: count }, (_, i) => ({
    from_ms: span.from_ms + i * length,
    to_ms: Math.min(span.to_ms, span.from_ms + (i + 1) * length),
  }));
}

/** What clocks of the zone show beyond UTC at an instant [ms]; null = UTC. */
export function offsetOf(zone: string | null, ms: number): number {
  return DateTime.fromMillis(ms, { zone: zone === null ? 'utc' : zoneOf(zone) }).offset * 60_000;
}

/**
 * An instant in ISO 8601 with the offset that the zone has then, to the second where it is whole;
 * without a zone in UTC.
 *
 * @throws RangeError for a zone that is not in the database
 */
export function writtenIn(zone: string | null, ms: number): string {
  const at = DateTime.fromMillis(ms, { zone: zone === null ? 'utc' : zoneOf(zone) });
  return at.toISO({ suppressMilliseconds: true }) as string;
}
