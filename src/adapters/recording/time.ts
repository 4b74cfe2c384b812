const ISO =
  /^(\d{4})-(\d\d)-(\d\d)[Tt ](\d\d):(\d\d)(?::(\d\d)(?:[.,](\d+))?)?\s?(?:([Zz])|([+-])(\d\d):?(\d\d)?)$/;
const SECONDS = /^[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?$/;
/** What a Date can hold (ECMA-262): 1e8 days either side of 1970. */
const LARGEST_MS = 8.64e15;

/**
 * A time of a recording in milliseconds since 1970-01-01T00:00:00Z, rounded to the millisecond:
 * ISO 8601 with an offset, or seconds since then. NaN for anything else, and for dates that the
 * calendar does not have. A local time without an offset is refused: it is ambiguous twice a year.
 */
export function parseTime(text: string): number {
  const field = text.trim();
  if (SECONDS.test(field)) {
    const ms = Math.round(Number(field) * 1000);
    return Math.abs(ms) <= LARGEST_MS ? ms : Number.NaN;
  }
  const match = ISO.exec(field);
  if (match === null) return Number.NaN;
  const part = (i: number) => Number(match[i] ?? 0);
  const [year, month, day, hour, minute, second] = [1, 2, 3, 4, 5, 6].map(part) as [
    number,
    number,
    number,
    number,
    number,
    number,
  ];
  if (hour > 23 || minute > 59 || second > 59 || part(10) > 23 || part(11) > 59) return Number.NaN;
  const date = new Date(0);
  date.setUTCFullYear(year, month - 1, day);
  if (date.getUTCMonth() !== month - 1 || date.getUTCDate() !== day) return Number.NaN;
  const fraction_ms = Math.round(Number(`0.${match[7] ?? '0'}`) * 1000);
  const offset_min = (match[9] === '-' ? -1 : 1) * (part(10) * 60 + part(11));
  return date.getTime() + ((hour * 60 + minute - offset_min) * 60 + second) * 1000 + fraction_ms;
}
