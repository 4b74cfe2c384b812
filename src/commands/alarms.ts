import type { Command } from 'commander';
import type { AlarmAction } from '../core/alarm/command.js';
import type { AlarmEntry } from '../core/alarm/entry.js';
import type { AlarmReport } from '../core/alarm/report.js';
import { RockhourError } from '../errors.js';
import { figuresText, listText } from './alarmText.js';
import { askDaemon } from './daemonAnswer.js';
import { parseDuration_s, parsePoint_ms } from './values.js';

export interface AlarmOptions {
  readonly url: string;
  readonly unit?: string;
  readonly acknowledge?: string;
  readonly reset?: string;
  readonly shelve?: string;
  readonly unshelve?: string;
  readonly outOfService?: string;
  readonly returnToService?: string;
  readonly for?: string;
  readonly who?: string;
  readonly why?: string;
  readonly figures?: boolean;
  readonly from?: string;
  readonly to?: string;
  readonly json?: boolean;
}

/** Option, path of its route, and what it does. */
const ACTIONS = [
  ['acknowledge', 'acknowledge', 'acknowledge'],
  ['reset', 'reset', 'reset'],
  ['shelve', 'shelve', 'shelve'],
  ['unshelve', 'unshelve', 'unshelve'],
  ['outOfService', 'out-of-service', 'out_of_service'],
  ['returnToService', 'return-to-service', 'return_to_service'],
] as const satisfies readonly (readonly [keyof AlarmOptions, string, AlarmAction])[];

const usage = (words: string) => new RockhourError('USAGE', words);
const flag = (name: string) =>
  `--${name.replace(/[A-Z]/g, (letter) => `-${letter.toLowerCase()}`)}`;

/**
 * What is to be done, null where something is to be read.
 * @throws RockhourError USAGE where options do not go together
 */
export function chosenAction(options: AlarmOptions): (typeof ACTIONS)[number] | null {
  const given = ACTIONS.filter(([name]) => options[name] !== undefined);
  const [first, second] = given;
  if (first !== undefined && second !== undefined)
    throw usage(`${flag(first[0])} and ${flag(second[0])} cannot be given together; one at a time`);
  if (first === undefined) {
    const alone = (['who', 'why', 'for'] as const).find((name) => options[name] !== undefined);
    if (alone !== undefined) throw usage(`--${alone} goes with what is done to an alarm`);
    const span = options.from ?? options.to;
    if (span !== undefined && !options.figures) throw usage('--from and --to go with --figures');
    return null;
  }
  const read = (['figures', 'from', 'to', 'unit'] as const).find(
    (name) => options[name] !== undefined,
  );
  if (read !== undefined) throw usage(`--${read} does not go with ${flag(first[0])}`);
  if (options.who === undefined) throw usage(`${flag(first[0])} needs --who: a name is recorded`);
  const wantsWhy = first[0] === 'shelve' || first[0] === 'outOfService';
  if (wantsWhy && options.why === undefined)
    throw usage(`${flag(first[0])} needs --why: the reason is recorded`);
  if ((first[0] === 'shelve') !== (options.for !== undefined))
    throw usage('--shelve and --for go together: how long it is hidden, such as 2h');
  return first;
}

function query(parts: Readonly<Record<string, string | undefined>>): string {
  const given = Object.entries(parts).filter(([, value]) => value !== undefined);
  const text = new URLSearchParams(given as [string, string][]).toString();
  return text === '' ? '' : `?${text}`;
}

const instant = (option: string, text: string | undefined) =>
  text === undefined ? undefined : new Date(parsePoint_ms(option, text)).toISOString();

async function act(
  options: AlarmOptions,
  [name, path]: (typeof ACTIONS)[number],
): Promise<{ answer: unknown; text: string }> {
  const { url, who, why } = options;
  const id = options[name];
  const hours =
    options.for === undefined ? {} : { hours: parseDuration_s('--for', options.for) / 3600 };
  const body = { id, who, ...(why === undefined ? {} : { why }), ...hours };
  const answer = (await askDaemon(url, `/api/alarms/${path}`, body)) as {
    state: string;
    alarm: AlarmEntry | null;
  };
  const until = answer.alarm?.shelved?.until;
  const state = answer.state.replaceAll('_', ' ');
  return { answer, text: `${id}: ${state}${until === undefined ? '' : ` until ${until}`}` };
}

async function alarms(options: AlarmOptions): Promise<void> {
  const action = chosenAction(options);
  const { url, unit } = options;
  let answer: unknown;
  let text: string;
  if (action !== null) ({ answer, text } = await act(options, action));
  else if (options.figures) {
    const span = { from: instant('--from', options.from), to: instant('--to', options.to) };
    const report = await askDaemon(url, `/api/alarms/figures${query({ unit, ...span })}`);
    answer = report;
    text = figuresText(report as AlarmReport);
  } else {
    const lists = await askDaemon(url, `/api/alarms${query({ unit })}`);
    answer = lists;
    text = listText(lists as { standing: AlarmEntry[]; suppressed: AlarmEntry[] });
  }
  process.stdout.write(`${options.json ? JSON.stringify(answer) : text}\n`);
}

export function register(program: Command): void {
  program
    .command('alarms')
    .description('alarms and alerts of a running daemon: list, figures, acknowledge, shelve')
    .requiredOption('--url <address>', 'of the daemon, such as http://127.0.0.1:8080')
    .option('--unit <id>', 'only of this unit')
    .option('--figures', 'rates, floods, chattering, stale and most frequent alarms')
    .option('--from <time>', 'beginning of the span of the figures (a day before its end)')
    .option('--to <time>', 'its end (the newest estimate)')
    .option('--acknowledge <alarm>', 'acknowledge the alarm or alert with this id')
    .option('--shelve <alarm>', 'hide it for some time, with --for and --why')
    .option('--unshelve <alarm>', 'show it again before that time is over')
    .option('--out-of-service <alarm>', 'hide it until it is returned to service, with --why')
    .option('--return-to-service <alarm>', 'take it back into service')
    .option('--reset <alarm>', 'release a latched one that has returned and was acknowledged')
    .option('--for <span>', 'time on the shelf, such as 30min or 2h')
    .option('--who <name>', 'whose word it is: recorded')
    .option('--why <reason>', 'recorded')
    .option('--json', 'answer as one line of JSON')
    .action(alarms);
}
