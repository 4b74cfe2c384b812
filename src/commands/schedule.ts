import { writeFileSync } from 'node:fs';
import type { Command } from 'commander';
import type { NearestView, Schedule } from '../core/plan/schedule.js';
import { readBlocks, type WrittenBlock } from '../core/plan/scheduleAsk.js';
import { csvValue, SCHEDULE_COLUMNS } from '../core/plan/scheduleCsv.js';
import { fileReasonOf, RockhourError } from '../errors.js';
import {
  type AheadHead,
  aheadCommand,
  answerRecorded,
  askAhead,
  checkAheadOptions,
  headLine,
  stateFromRecording,
} from './aheadState.js';
import { certaintyOf, type ScheduleOptions, writtenSchedule } from './schedule/question.js';
import { scheduleText } from './schedule/text.js';

type ScheduleAnswer = AheadHead & Schedule;

async function answerOf(options: ScheduleOptions): Promise<ScheduleAnswer> {
  const { blocks: written, pathOf } = writtenSchedule(options);
  const certainty = certaintyOf(options);
  if (options.url !== undefined) {
    const { zone, stale } = options;
    const body = {
      ...{ blocks: written.map(asJson), certainty },
      ...(zone === undefined ? {} : { zone }),
      ...(stale === undefined ? {} : { stale }),
    };
    return (await askAhead(options, 'schedule', {}, body)) as ScheduleAnswer;
  }
  const recorded = await stateFromRecording(options);
  const { unit, head } = recorded;
  const zone = options.zone ?? unit.limits.connection?.time_zone ?? null;
  const now_ms = Date.parse(head.time);
  const asked_ms = now_ms + (head.age_s ?? 0) * 1000;
  const read = readBlocks(written, zone, now_ms, pathOf, asked_ms);
  if ('faults' in read) {
    const said = read.faults.map(
      ({ field, value, expected }) => `${field} is ${JSON.stringify(value)}; expected ${expected}`,
    );
    throw new RockhourError('USAGE', said.join('\n'));
  }
  const ask = { blocks: read.blocks, certainty, zone, asked_ms };
  return { ...head, ...answerRecorded(recorded, { kind: 'schedule', ask }) };
}

/** As the HTTP route takes it: a power in CSV or on the command line is text. */
function asJson({ power_MW_el: power, ...block }: WrittenBlock): WrittenBlock {
  if (power === undefined || power === null || power === '') return block;
  const number = typeof power === 'string' && power.trim() !== '' ? Number(power) : power;
  return { ...block, power_MW_el: Number.isFinite(number) ? number : power };
}

/** The nearest schedule as a file that `--blocks` reads. */
function writeNearest(path: string, nearest: NearestView | null): void {
  if (nearest === null) {
    process.stderr.write(`${path} is not written: no schedule near it was found that holds\n`);
    return;
  }
  const rows = nearest.blocks.map((block) =>
    SCHEDULE_COLUMNS.map((name) => csvValue(block[name])).join(','),
  );
  try {
    writeFileSync(path, `${[SCHEDULE_COLUMNS.join(','), ...rows].join('\r\n')}\r\n`);
  } catch (cause) {
    throw new RockhourError(
      'OUTPUT_UNWRITABLE',
      `${path} cannot be written: ${fileReasonOf(cause)}`,
      { cause },
    );
  }
}

async function schedule(options: ScheduleOptions): Promise<void> {
  checkAheadOptions('schedule', options);
  const answer = await answerOf(options);
  if (options.nearest !== undefined) writeNearest(options.nearest, answer.nearest);
  const text = options.json
    ? JSON.stringify(answer)
    : [headLine(answer), ...scheduleText(answer)].join('\n');
  process.stdout.write(`${text}\n`);
}

const collect = (text: string, before: readonly string[] = []): readonly string[] => [
  ...before,
  text,
];

export function register(program: Command): void {
  aheadCommand(
    program,
    'schedule',
    'whether a list of blocks holds, where it falls short, the nearest that holds',
  )
    .option('--blocks <file>', 'CSV with from,to,mode,power_MW_el, or JSON')
    .option('--block <text>', 'a block, such as "discharge 1.5 FROM TO"; once for each', collect)
    .option('--zone <name>', 'IANA zone of times without offset (default: of the connection)')
    .option('--certainty <share>', 'of firm figures and of the nearest schedule (default: 0.9)')
    .option('--nearest <file>', 'write the nearest schedule that holds as CSV')
    .option('--json', 'answer as one line of JSON')
    .action(schedule);
}
