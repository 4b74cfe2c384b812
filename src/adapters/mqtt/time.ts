// ISO 8601 as RFC 3339 narrows it: date, T, time with seconds, optional fraction, Z or an offset.
const ISO_8601 =
  /^(\d{4})-(\d\d)-(\d\d)T(\d\d):(\d\d):(\d\d)(?:\.(\d+))?(?:Z|([+-])(\d\d):(\d\d))$/;
/** Greatest time that a Date can hold [ms], ECMA-262 section 21.4.1.1. */
const GREATEST_MS = 8.64e15;

/**
 * A source time in ms since 1970, whole (rounded down); NaN where it is none. Date.parse alone
 * would take the 30th of February and times without an offset.
 * @param time ISO 8601 with an offset, or ms since 1970 as a number
 */
export function sourceTime(time: unknown): number {
  if (typeof time === 'number') {
    return Math.abs(time) <= GREATEST_MS ? Math.floor(time) + 0 : Number.NaN;
  }
  if (typeof time !== 'string') return Number.NaN;
  const match = ISO_8601.exec(time);
  if (!match) return Number.NaN;
  const [year, month, day, hour, minute, second] = match.slice(1, 7).map(Number) as Six;
  const offsetHour = Number(match[9] ?? 0);
  const offsetMinute = Number(match[10] ?? 0);
  if (month < 1 || month > 12 || day < 1 || day > daysInMonth(year, month)) return Number.NaN;
  if (hour > 23 || minute > 59 || second > 59 || offsetHour > 23 || offsetMinute > 59) {
    return Number.NaN;
  }
  const fraction_ms = Number((match[7] ?? '0').padEnd(3, '0').slice(0, 3));
  const local = Date.UTC(2000, month - 1, day, hour, minute, second, fraction_ms);
  // Date.UTC takes the years 0..99 for 1900..1999, so the year is set apart.
  const at = new Date(local);
  at.setUTCFullYear(year, month - 1, day);
  const offset_ms = (offsetHour * 60 + offsetMinute) * 60_000 * (match[8] === '-' ? -1 : 1);
  return at.getTime() - offset_ms;
}

type Six = [number, number, number, number, number, number];

function daysInMonth(year: number, month: number): number {
  if (month !== 2) return [4, 6, 9, 11].includes(month) ? 30 : 31;
  return year % 4 === 0 && (year % 100 !== 0 || year % 400 === 0) ? 29 : 28;
}
