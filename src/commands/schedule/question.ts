import { readFileSync } from 'node:fs';
import {
  GREATEST_CERTAINTY,
  LEAST_CERTAINTY,
  type WrittenBlock,
} from '../../core/plan/scheduleAsk.js';
import { csvPath, readScheduleCsv } from '../../core/plan/scheduleCsv.js';
import { fileReasonOf, RockhourError, reasonOf } from '../../errors.js';
import type { AheadOptions } from '../aheadState.js';

export interface ScheduleOptions extends AheadOptions {
  readonly blocks?: string;
  readonly block?: readonly string[];
  readonly zone?: string;
  readonly certainty?: string;
  readonly nearest?: string;
}

/** Blocks as they were written, and how a field of one is named. */
export interface WrittenSchedule {
  readonly blocks: readonly WrittenBlock[];
  readonly pathOf: (index: number, field: string) => string;
}

const ONE = /^(?:(charge|discharge)\s+(\S+)|(stand))\s+(\S+)\s+(\S+)$/;
const ONE_EXPECTED =
  '"discharge 1.5 2026-12-02T17:00+01:00 2026-12-02T21:00+01:00", or "stand FROM TO"';

function usage(message: string): RockhourError {
  return new RockhourError('USAGE', message);
}

/** Probability of the firm figures. */
export function certaintyOf({ certainty = '0.9' }: ScheduleOptions): number {
  const value = /^0?\.\d+$/.test(certainty.trim()) ? Number(certainty) : Number.NaN;
  if (value >= LEAST_CERTAINTY && value <= GREATEST_CERTAINTY) return value;
  const range = `${LEAST_CERTAINTY} to ${GREATEST_CERTAINTY}`;
  throw usage(`--certainty is ${JSON.stringify(certainty)}; expected ${range}, such as 0.9`);
}

/**
 * The blocks of `--blocks`, or those of every `--block`.
 * @throws RockhourError USAGE
 */
export function writtenSchedule({ blocks, block }: ScheduleOptions): WrittenSchedule {
  if ((blocks === undefined) === (block === undefined)) {
    throw usage('schedule needs either --blocks with a file, or one --block or several');
  }
  if (blocks !== undefined) return fromFile(blocks);
  const written = (block ?? []).map((text) => {
    const match = ONE.exec(text.trim());
    if (match === null) throw usage(`--block is ${JSON.stringify(text)}; expected ${ONE_EXPECTED}`);
    const [, mode, power_MW_el, stand, from, to] = match;
    return { mode: mode ?? stand, power_MW_el, from, to };
  });
  return { blocks: written, pathOf: (index, field) => `--block ${index + 1} ${field}` };
}

function fromFile(path: string): WrittenSchedule {
  let text: string;
  try {
    text = readFileSync(path, 'utf8');
  } catch (cause) {
    throw new RockhourError('USAGE', `--blocks ${path} cannot be read: ${fileReasonOf(cause)}`, {
      cause,
    });
  }
  if (/^\ufeff?\s*[[{]/.test(text)) return fromJson(path, text.replace(/^\ufeff/, ''));
  const csv = readScheduleCsv(text);
  if ('faults' in csv) {
    const said = csv.faults.map(
      ({ field, value, expected }) =>
        `${path} ${field} is ${JSON.stringify(value)}; expected ${expected}`,
    );
    throw usage(said.join('\n'));
  }
  const inRow = csvPath(csv.rows);
  return { blocks: csv.blocks, pathOf: (index, field) => `${path} ${inRow(index, field)}` };
}

/** A list of blocks, or an object that has one, as the HTTP route takes it. */
function fromJson(path: string, text: string): WrittenSchedule {
  let found: unknown;
  try {
    found = JSON.parse(text);
  } catch (cause) {
    throw new RockhourError('USAGE', `--blocks ${path} is not JSON: ${reasonOf(cause)}`, { cause });
  }
  const blocks = Array.isArray(found) ? found : (found as { blocks?: unknown }).blocks;
  const sound = (one: unknown): boolean =>
    typeof one === 'object' && one !== null && !Array.isArray(one);
  if (!Array.isArray(blocks) || !blocks.every(sound)) {
    throw usage(
      `--blocks ${path}: expected [{"mode", "power_MW_el", "from", "to"}, ...], or an object with "blocks"`,
    );
  }
  return { blocks, pathOf: (index, field) => `${path} blocks.${index}.${field}` };
}
