import type { Mode } from '../definitions.js';
import { instantOf, isTimeZone, writtenIn } from './localTime.js';

/** One block of a schedule: what the unit is meant to do at the connection point. */
export interface Block {
  readonly mode: Mode;
  /** Net power [W], at least 0; 0 while standing. */
  readonly power_W: number;
  /** [ms since 1970-01-01T00:00:00Z] */
  readonly from_ms: number;
  readonly to_ms: number;
}

export interface ScheduleAsk {
  /** In order of time, without overlaps; between them the unit stands. See `readBlocks`. */
  readonly blocks: readonly Block[];
  /** Probability with which figures are at least reached, 0.50 to 0.99. */
  readonly certainty: number;
  /** IANA zone in which times are written; null = UTC. */
  readonly zone: string | null;
  /** Clock of who asks [ms since 1970]; a start before it is past. Absent: time of the estimate. */
  readonly asked_ms?: number;
}

/** A block as it was written, before anything is known of it. */
export interface WrittenBlock {
  readonly mode?: unknown;
  readonly power_MW_el?: unknown;
  readonly from?: unknown;
  readonly to?: unknown;
}

/** What is wrong with a question, and what would be right. */
export interface Fault {
  readonly field: string;
  readonly value: unknown;
  readonly expected: string;
}

export const MODES = ['charge', 'discharge', 'stand'] as const satisfies readonly Mode[];
export const MOST_BLOCKS = 400;
/** How far ahead a schedule may reach [ms]: a week. */
export const MOST_AHEAD_MS = 7 * 86_400_000;
const GREATEST_MW = 10_000;
export const LEAST_CERTAINTY = 0.5;
export const GREATEST_CERTAINTY = 0.99;
/** Plain decimals only: Number() would also take '', '0x10' and ' 1 '. */
const DECIMAL = /^[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?$/i;

/**
 * Reads the blocks of a schedule, in any order, and holds them against all that can be said before
 * the beds are asked.
 *
 * @param zone IANA zone of times without offset, null = none: then each needs its offset
 * @param now_ms source time of the estimate, before which no block may begin
 * @param pathOf name of a block's field in the question, as in `blocks.3.from`
 * @param asked_ms clock of who asks, in source time; where later than `now_ms`, no block may begin
 *   before it
 * @returns the blocks in order of time, or every fault
 */
export function readBlocks(
  written: readonly WrittenBlock[],
  zone: string | null,
  now_ms: number,
  pathOf: (index: number, field: string) => string = (index, field) => `blocks.${index}.${field}`,
  asked_ms: number = now_ms,
): { readonly blocks: readonly Block[] } | { readonly faults: readonly Fault[] } {
  const faults: Fault[] = [];
  if (zone !== null && !isTimeZone(zone)) {
    return {
      faults: [{ field: 'zone', value: zone, expected: 'an IANA time zone such as Europe/Paris' }],
    };
  }
  if (written.length === 0 || written.length > MOST_BLOCKS) {
    const expected = `1 to ${MOST_BLOCKS} blocks`;
    return { faults: [{ field: 'blocks', value: written.length, expected }] };
  }
  const read = written.map((block, i) => {
    const fault = (field: string, value: unknown, expected: string): void => {
      faults.push({ field: pathOf(i, field), value: value ?? null, expected });
    };
    return { index: i, block: readBlock(block, zone, { now_ms, asked_ms }, fault) };
  });
  const sound = read.flatMap(({ index, block }) => (block === null ? [] : [{ index, block }]));
  sound.sort((a, b) => a.block.from_ms - b.block.from_ms);
  sound.slice(1).forEach(({ index, block }, n) => {
    const before = sound[n] as (typeof sound)[number];
    if (block.from_ms >= before.block.to_ms) return;
    const ends = writtenIn(zone, before.block.to_ms);
    faults.push({
      field: pathOf(index, 'from'),
      value: written[index]?.from ?? null,
      expected: `${ends} or later, the end of the block that begins at ${writtenIn(zone, before.block.from_ms)}: blocks may not overlap`,
    });
  });
  return faults.length > 0 ? { faults } : { blocks: sound.map(({ block }) => block) };
}

function readBlock(
  written: WrittenBlock,
  zone: string | null,
  { now_ms, asked_ms }: { readonly now_ms: number; readonly asked_ms: number },
  fault: (field: string, value: unknown, expected: string) => void,
): Block | null {
  let wrong = false;
  const refuse = (field: string, value: unknown, expected: string): void => {
    wrong = true;
    fault(field, value, expected);
  };
  const mode = MODES.find((one) => one === written.mode);
  if (mode === undefined) refuse('mode', written.mode, `one of ${MODES.join(', ')}`);
  const power_MW = powerOf(written.power_MW_el, mode);
  if (mode === 'stand' && power_MW !== 0) {
    refuse('power_MW_el', written.power_MW_el, '0 or none while standing');
  } else if (!(power_MW >= 0 && power_MW <= GREATEST_MW)) {
    const how = 'the direction is told by the mode';
    const range = `a power in MW_el from 0 to ${GREATEST_MW}: ${how}`;
    refuse('power_MW_el', written.power_MW_el, range);
  }
  const at = (field: 'from' | 'to'): number => {
    const value = written[field];
    const instant = instantOf(typeof value === 'string' ? value : '', zone);
    if ('ms' in instant) return instant.ms;
    refuse(field, value, instant.expected);
    return Number.NaN;
  };
  const from_ms = at('from');
  const to_ms = at('to');
  const earliest_ms = Math.max(now_ms, asked_ms);
  if (from_ms < earliest_ms) {
    const what = asked_ms > now_ms ? 'the present' : 'the time of the estimate';
    const earliest = writtenIn(zone, earliest_ms);
    refuse('from', written.from, `${earliest} or later, ${what}: that time is past`);
  }
  if (to_ms <= from_ms) refuse('to', written.to, `later than from, ${writtenIn(zone, from_ms)}`);
  else if (to_ms > now_ms + MOST_AHEAD_MS) {
    const last = writtenIn(zone, now_ms + MOST_AHEAD_MS);
    refuse('to', written.to, `${last} or earlier, 7 days after the estimate`);
  }
  if (wrong || mode === undefined) return null;
  return { mode, power_W: power_MW * 1e6, from_ms, to_ms };
}

/** [MW]; NaN for what is no power. Standing needs none. */
function powerOf(value: unknown, mode: Mode | undefined): number {
  const none = value === undefined || value === null || value === '';
  if (none) return mode === 'stand' ? 0 : Number.NaN;
  if (typeof value === 'number') return value;
  const text = typeof value === 'string' ? value.trim() : '';
  return DECIMAL.test(text) ? Number(text) : Number.NaN;
}

/**
 * What every answer needs of a question, wherever it comes from.
 *
 * @throws RangeError naming field, value and what would be right
 */
export function requireSchedule(ask: ScheduleAsk, now_ms: number): void {
  const { certainty } = ask;
  if (!(certainty >= LEAST_CERTAINTY && certainty <= GREATEST_CERTAINTY)) {
    const range = `${LEAST_CERTAINTY} to ${GREATEST_CERTAINTY}`;
    throw new RangeError(`certainty = ${certainty}: expected ${range}`);
  }
  const written = ask.blocks.map(({ mode, power_W, from_ms, to_ms }) => {
    if (!Number.isFinite(from_ms) || !Number.isFinite(to_ms)) {
      throw new RangeError(`blocks: from_ms = ${from_ms}, to_ms = ${to_ms}: expected finite times`);
    }
    const from = writtenIn(null, from_ms);
    return { mode, power_MW_el: power_W / 1e6, from, to: writtenIn(null, to_ms) };
  });
  const read = readBlocks(written, ask.zone, now_ms, undefined, ask.asked_ms);
  const [first] = 'faults' in read ? read.faults : [];
  if (first === undefined) return;
  throw new RangeError(
    `${first.field} = ${JSON.stringify(first.value)}: expected ${first.expected}`,
  );
}
