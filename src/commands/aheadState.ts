import type { Command } from 'commander';
import type { UnitDefinition } from '../core/definitions.js';
import type { Quality } from '../core/estimate.js';
import { answerPlan, type PlanAnswers, type PlanQuestion } from '../core/plan/ask.js';
import { aheadHead } from '../core/plan/head.js';
import type { Scan } from '../core/scan/scan.js';
import { advance, startUnit, type UnitState } from '../core/unit.js';
import { RockhourError, reasonOf } from '../errors.js';
import { askDaemon } from './daemonAnswer.js';
import { loadUnit } from './site.js';
import { parsePoint_ms } from './values.js';
import { tellCounts, walkRecording } from './walk.js';

/** Options of every command about what lies ahead. */
export interface AheadOptions {
  readonly config?: string;
  readonly recording?: string;
  readonly at?: string;
  readonly url?: string;
  readonly unit?: string;
  readonly stale?: string;
  readonly json?: boolean;
}

/** What an answer stands on, whoever gave it. */
export interface AheadHead {
  readonly unit: string;
  readonly time: string;
  readonly age_s: number | null;
  readonly quality: Quality | null;
  /** What every figure takes for granted. */
  readonly given?: string;
  readonly valid_until?: string;
  /** What binds what the unit can sell. */
  readonly limits?: ReturnType<typeof aheadHead>['limits'];
  /** Of a daemon alone. */
  readonly stale?: boolean;
}

/** A unit as it is at the end of a recording, or at `--at`. */
export interface RecordedState {
  readonly unit: UnitDefinition;
  readonly state: UnitState;
  readonly head: AheadHead;
}

/**
 * @param command name of the command, for what it says
 * @throws RockhourError USAGE where options do not go together
 */
export function checkAheadOptions(command: string, options: AheadOptions): void {
  const { url, config, recording, at, stale } = options;
  if (url !== undefined && (recording ?? config ?? at) !== undefined) {
    throw new RockhourError(
      'USAGE',
      '--url asks a daemon; --config, --recording and --at do not go with it',
    );
  }
  if (url === undefined && (config === undefined || recording === undefined)) {
    throw new RockhourError(
      'USAGE',
      `${command} needs --config and --recording, or --url of a daemon`,
    );
  }
  if (stale !== undefined && url === undefined) {
    throw new RockhourError('USAGE', '--stale goes with --url: a recording has no age');
  }
  if (stale !== undefined && stale !== 'refuse' && stale !== 'mark') {
    throw new RockhourError(
      'USAGE',
      `--stale is ${JSON.stringify(stale)}; expected refuse or mark`,
    );
  }
}

/**
 * Runs a recording up to its end or `--at`.
 * @throws RockhourError RECORDING_*, UNIT_UNKNOWN, USAGE
 */
export async function stateFromRecording(options: AheadOptions): Promise<RecordedState> {
  const recording = options.recording as string;
  const at_ms = options.at === undefined ? null : parsePoint_ms('--at', options.at);
  const { unit, otherChannels } = loadUnit(options.config as string, options.unit);
  const state = startUnit(unit);
  let begins_ms: number | null = null;
  let quality: Quality | null = null;
  const reader = await walkRecording(recording, unit, otherChannels, (scan: Scan) => {
    begins_ms ??= scan.time_ms;
    if (at_ms !== null && scan.time_ms > at_ms) return false;
    const ask = { hours_at_W: [], profile: false };
    quality = advance(unit, state, scan, ask).estimate.quality;
    return true;
  });
  for (const line of tellCounts(reader)) process.stderr.write(`${line}\n`);
  if (state.time_ms === null) throw nothingBefore(recording, options.at, begins_ms);
  const time = new Date(state.time_ms).toISOString();
  const age_s = at_ms === null ? 0 : (at_ms - state.time_ms) / 1000;
  return { unit, state, head: { age_s, ...aheadHead(unit, time, quality ?? 'blind') } };
}

export function nothingBefore(
  recording: string,
  at: string | undefined,
  begins_ms: number | null,
): RockhourError {
  if (begins_ms === null) {
    return new RockhourError('RECORDING_MALFORMED', `${recording} has a header but no rows`, {
      advice: 'Hours need at least one scan.',
    });
  }
  const begins = new Date(begins_ms).toISOString();
  return new RockhourError('USAGE', `--at is ${at}, but ${recording} begins at ${begins}`, {
    advice: 'Name a time within the recording.',
  });
}

/** The only unit of a running daemon; with several one has to be named. */
export async function onlyUnitOf(url: string): Promise<string> {
  const { units } = (await askDaemon(url, '/api/units')) as { units: { unit: string }[] };
  if (units.length === 1 && units[0] !== undefined) return units[0].unit;
  throw new RockhourError(
    'UNIT_UNKNOWN',
    `the daemon has several units and none was named: ${units.map(({ unit }) => unit).join(', ')}`,
  );
}

/**
 * Answers a question from a recorded state.
 * @throws RockhourError USAGE with the core's words where the question is wrong
 */
export function answerRecorded<K extends PlanQuestion['kind']>(
  { unit, state }: RecordedState,
  question: PlanQuestion & { readonly kind: K },
): PlanAnswers[K] {
  try {
    return answerPlan(unit, state, question) as PlanAnswers[K];
  } catch (thrown) {
    if (!(thrown instanceof RangeError)) throw thrown;
    throw new RockhourError('USAGE', reasonOf(thrown), { cause: thrown });
  }
}

/**
 * Asks a daemon for `/api/units/UNIT/<path>`.
 * @param query without `stale`, which comes from the options
 * @param body what is posted, `stale` in it; without it the question is a GET
 */
export async function askAhead(
  options: AheadOptions,
  path: string,
  query: Readonly<Record<string, string | undefined>>,
  body?: object,
): Promise<AheadHead> {
  const url = options.url as string;
  const unit = options.unit ?? (await onlyUnitOf(url));
  const search = new URLSearchParams();
  const stale = body === undefined ? options.stale : undefined;
  for (const [key, value] of Object.entries({ ...query, stale })) {
    if (value !== undefined) search.set(key, value);
  }
  const asked = search.size === 0 ? path : `${path}?${search}`;
  const address = `/api/units/${encodeURIComponent(unit)}/${asked}`;
  return (await askDaemon(url, address, body)) as AheadHead;
}

/** First line of every table for people. */
export function headLine({ unit, time, age_s, quality, stale }: AheadHead): string {
  const age = age_s === null ? '' : `, ${Math.round(age_s)} s old`;
  const mark = stale === true ? ', STALE' : '';
  return `${unit}: estimate of ${time}${age}${mark}, quality ${quality ?? 'unknown'}`;
}

/** A command with the options that every question about what lies ahead has; `--json` is the caller's last. */
export function aheadCommand(program: Command, name: string, description: string): Command {
  return program
    .command(name)
    .description(description)
    .option('--config <file>', 'configuration of the site (YAML); with --recording')
    .option('--recording <file>', 'recording after whose last row, or at --at, it is asked')
    .option('--at <time>', 'take rows up to this time (ISO 8601 with offset, or seconds)')
    .option('--url <address>', 'ask a running daemon instead, such as http://127.0.0.1:8080')
    .option('--unit <id>', 'unit asked for; needed where there are several')
    .option('--stale <what>', 'where the estimate of a daemon is stale: refuse (default) or mark');
}
