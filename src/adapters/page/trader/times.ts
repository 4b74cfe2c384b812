/** Times of the sheet are those of the connection, as blocks are sold in them. */

const two = (value: number): string => String(value).padStart(2, '0');

interface Wall {
  readonly date: string;
  readonly clock: string;
}

const formats = new Map<string, Intl.DateTimeFormat>();

function formatOf(zone: string): Intl.DateTimeFormat {
  const known = formats.get(zone);
  if (known !== undefined) return known;
  const made = new Intl.DateTimeFormat('en-GB', {
    timeZone: zone,
    ...{ year: 'numeric', month: '2-digit', day: '2-digit', weekday: 'short' },
    ...{ hour: '2-digit', minute: '2-digit', hourCycle: 'h23' },
  });
  formats.set(zone, made);
  return made;
}

/** Day and time of day that clocks of the zone show; without one, of UTC. */
export function wallOf(zone: string | null, time: string | number): Wall & { day: string } {
  const parts = formatOf(zone ?? 'UTC').formatToParts(new Date(time));
  const of = (name: Intl.DateTimeFormatPartTypes): string =>
    parts.find(({ type }) => type === name)?.value ?? '';
  return {
    date: `${of('year')}-${of('month')}-${of('day')}`,
    day: `${of('weekday')} ${Number(of('day'))}`,
    clock: `${of('hour')}:${of('minute')}`,
  };
}

export const clockIn = (zone: string | null, time: string | number): string =>
  wallOf(zone, time).clock;

/** `18:00`, or with the day where it is not that of `beside`: `Sat 31 18:00`. */
export function shortTime(zone: string | null, time: string | number, beside: number): string {
  const { date, day, clock } = wallOf(zone, time);
  return date === wallOf(zone, beside).date ? clock : `${day} ${clock}`;
}

/** From when to when; `07:00 for 20 s` where both are told alike. */
export function spanWords(from: string, to: string, clock: (time: string) => string): string {
  const [begins, ends] = [clock(from), clock(to)];
  if (begins !== ends) return `${begins} to ${ends}`;
  return `${begins} for ${Math.round((Date.parse(to) - Date.parse(from)) / 1000)} s`;
}

/** As it is typed into a schedule: `2026-01-31 18:00`. */
export function typedTime(zone: string | null, time: string | number): string {
  const { date, clock } = wallOf(zone, time);
  return `${date} ${clock}`;
}

export const zoneWords = (zone: string | null): string => zone ?? 'UTC';

/** Whole hours at which a time axis is marked, few enough for the room: `[ms, label]`. */
export function hourMarks(
  zone: string | null,
  from_ms: number,
  to_ms: number,
  most: number,
): [number, string][] {
  const HOUR_MS = 3_600_000;
  const span_h = (to_ms - from_ms) / HOUR_MS;
  const step = [1, 2, 3, 4, 6, 12, 24, 48].find((one) => span_h / one <= most) ?? 48;
  const marks: [number, string][] = [];
  const quarter = 900_000;
  for (let at = Math.ceil(from_ms / quarter) * quarter; at <= to_ms; at += quarter) {
    const { clock, day } = wallOf(zone, at);
    const [hour, minute] = clock.split(':').map(Number) as [number, number];
    if (minute !== 0 || hour % Math.min(step, 24) !== 0) continue;
    marks.push([at, hour === 0 ? day : `${two(hour)}:00`]);
  }
  return marks;
}
