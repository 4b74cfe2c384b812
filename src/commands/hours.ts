import type { Command } from 'commander';
import type { DispatchAnswer } from '../core/estimate.js';
import { aheadHead } from '../core/plan/head.js';
import type { CommandCause } from '../core/plan/leg.js';
import { type LimitedAnswer, limitedAnswers } from '../core/plan/limitedBy.js';
import type { Scan } from '../core/scan/scan.js';
import { advance, startUnit } from '../core/unit.js';
import {
  type AheadHead,
  type AheadOptions,
  askAhead,
  checkAheadOptions,
  headLine,
  nothingBefore,
  onlyUnitOf,
} from './aheadState.js';
import { askDaemon } from './daemonAnswer.js';
import { firstMinutesText } from './firstMinutesText.js';
import { loadUnit } from './site.js';
import { table } from './table.js';
import { parsePoint_ms, parsePowers_W } from './values.js';
import { tellCounts, walkRecording } from './walk.js';

interface HoursOptions extends AheadOptions {
  readonly power: string;
}

/** The hours of a unit, with the time and the age of the estimate that they stand on. */
interface HoursAnswer extends AheadHead {
  readonly state_of_charge: number | null;
  readonly answers: readonly LimitedAnswer[];
}

async function fromRecording(options: HoursOptions): Promise<HoursAnswer> {
  const recording = options.recording as string;
  const powers_W = parsePowers_W('--power', options.power);
  const at_ms = options.at === undefined ? null : parsePoint_ms('--at', options.at);
  const { unit, otherChannels } = loadUnit(options.config as string, options.unit);
  const state = startUnit(unit);
  // The newest scan waits until it is known whether it is the last: hours belong to that one.
  let waiting: Scan | null = null;
  let begins_ms: number | null = null;
  const reader = await walkRecording(recording, unit, otherChannels, (scan) => {
    begins_ms ??= scan.time_ms;
    if (at_ms !== null && scan.time_ms > at_ms) return false;
    if (waiting !== null) advance(unit, state, waiting, { hours_at_W: [], profile: false });
    waiting = scan;
    return true;
  });
  for (const line of tellCounts(reader)) process.stderr.write(`${line}\n`);
  // Widened again: the compiler does not see the assignments inside the visit.
  const last = waiting as Scan | null;
  if (last === null) throw nothingBefore(recording, options.at, begins_ms);
  const { estimate } = advance(unit, state, last, { hours_at_W: powers_W, profile: false });
  return {
    ...aheadHead(unit, estimate.time, estimate.quality),
    age_s: at_ms === null ? 0 : (at_ms - last.time_ms) / 1000,
    state_of_charge: estimate.state_of_charge,
    answers: limitedAnswers(unit, estimate.time, estimate.dispatch ?? []),
  };
}

async function fromDaemon(url: string, options: HoursOptions): Promise<HoursAnswer> {
  const powers_MW = parsePowers_W('--power', options.power).map((power) => power / 1e6);
  const unit = options.unit ?? (await onlyUnitOf(url));
  const query = { power_MW: powers_MW.join(',') };
  const hours = (await askAhead({ ...options, unit }, 'hours', query)) as HoursAnswer;
  const now = (await askDaemon(url, `/api/units/${encodeURIComponent(unit)}`)) as {
    estimate: { state_of_charge: number } | null;
  };
  return { ...hours, state_of_charge: now.estimate?.state_of_charge ?? null };
}

const LIMIT_WORDS: Readonly<Record<CommandCause, string>> = {
  start_up: 'the unit has to start first',
  change_over: 'the unit has to change its direction first',
  below_least_power: 'less than the machine can hold',
  above_greatest_power: 'more than the machine gives',
  connection: 'more than the connection lets through at some time of it',
  outage: 'an outage is planned within it',
};

/** One line about a power that a limit keeps the unit from. */
export function limitLine(power_MW: number, done: 'given' | 'taken', cause: CommandCause): string {
  return `${power_MW} MW cannot be ${done} all the while (${cause}): ${LIMIT_WORDS[cause]}.`;
}

function text(answer: HoursAnswer): string {
  const charge =
    answer.state_of_charge === null
      ? ''
      : `, state of charge ${(answer.state_of_charge * 100).toFixed(1)} %`;
  const three = ({ p90, p50, p10 }: DispatchAnswer['hours']) =>
    [p90, p50, p10].map((x) => x.toFixed(2));
  const rows = answer.answers.map((one) => [
    one.power_MW,
    ...three(one.hours),
    ...three(one.energy_MWh_el),
    one.ends_by,
  ]);
  const header = ['MW', 'h p90', 'h p50', 'h p10', 'MWh_el p90', 'MWh_el p50', 'MWh_el p10'];
  return [
    `${headLine(answer)}${charge}`,
    table([...header, 'ends by'], rows),
    ...answer.answers.flatMap(({ power_MW, limited_by }) =>
      limited_by === null ? [] : [limitLine(power_MW, 'given', limited_by)],
    ),
    ...answer.answers.flatMap(({ power_MW, first_minutes }) =>
      first_minutes === undefined
        ? []
        : [`${power_MW} MW: ${firstMinutesText(first_minutes, 'given')}.`],
    ),
    'p90 is the firm figure: exceeded with 90 % probability.',
  ].join('\n');
}

async function hours(options: HoursOptions): Promise<void> {
  checkAheadOptions('hours', options);
  const answer =
    options.url === undefined
      ? await fromRecording(options)
      : await fromDaemon(options.url, options);
  process.stdout.write(`${options.json ? JSON.stringify(answer) : text(answer)}\n`);
}

export function register(program: Command): void {
  program
    .command('hours')
    .description('hours and MWh_el left at given powers, from a recording or a running daemon')
    .option('--config <file>', 'configuration of the site (YAML); with --recording')
    .option('--recording <file>', 'recording after whose last row, or at --at, hours are computed')
    .option('--at <time>', 'take rows up to this time (ISO 8601 with offset, or seconds)')
    .option('--url <address>', 'ask a running daemon instead, such as http://127.0.0.1:8080')
    .option('--unit <id>', 'unit asked for; needed where there are several')
    .option('--stale <what>', 'where the estimate of a daemon is stale: refuse (default) or mark')
    .requiredOption('--power <MW>', 'powers, such as 1.2,1.8')
    .option('--json', 'answer as one line of JSON')
    .action(hours);
}
