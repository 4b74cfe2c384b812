import { hasOffset, type LineFault, type TypedBlock } from './scheduleText.js';
import { typedTime, wallOf } from './times.js';

/** What the server takes of a schedule: rows, and how far ahead [days]. */
const MOST_BLOCKS = 400;
const MOST_DAYS = 7;
const GREATEST_MW = 10_000;
const DAY_MS = 86_400_000;

/** A time as clocks of the zone show it, whatever offset it was typed with. */
export const inZone = (zone: string | null, time: string): string =>
  hasOffset(time) ? typedTime(zone, Date.parse(time)) : time.replace('T', ' ');

/** A local time, or an instant, to be compared with what clocks of the zone show at another. */
function isBefore(zone: string | null, time: string, instant_ms: number): boolean {
  if (hasOffset(time)) return Date.parse(time) < instant_ms;
  const { date, clock } = wallOf(zone, instant_ms);
  const second = String(Math.floor(instant_ms / 1000) % 60).padStart(2, '0');
  return time.padEnd(19, ':00') < `${date}T${clock}:${second}`;
}

/**
 * What the server would refuse of rows that can be read: told at their lines as they are typed, so that
 * a schedule is asked about only where it can be answered. Clocks that change are left to the server.
 *
 * @param now_ms clock of the plant; no block may begin before it
 * @param estimate_ms time of the newest estimate, from which the days ahead count
 */
export function beyondLimits(
  blocks: readonly TypedBlock[],
  zone: string | null,
  now_ms: number,
  estimate_ms: number,
): LineFault[] {
  const last_ms = estimate_ms + MOST_DAYS * DAY_MS;
  const faults = blocks.flatMap(({ line, from, to, power_MW_el }) => {
    const words: string[] = [];
    if (isBefore(zone, from, now_ms)) {
      words.push(`it begins at ${inZone(zone, from)}, which is past`);
    }
    if (hasOffset(from) && hasOffset(to) && Date.parse(to) <= Date.parse(from)) {
      words.push(`it ends at ${inZone(zone, to)}, not after it begins`);
    }
    if (!isBefore(zone, to, last_ms + 1000)) {
      words.push(`it ends at ${inZone(zone, to)}, more than ${MOST_DAYS} days ahead`);
    }
    if (power_MW_el > GREATEST_MW) words.push(`a power is ${GREATEST_MW} MW at most`);
    return words.map((one) => ({ line, words: one }));
  });
  if (blocks.length <= MOST_BLOCKS) return faults;
  const words = `${blocks.length} blocks; ${MOST_BLOCKS} can be checked at once`;
  return [{ line: 0, words }, ...faults];
}
