import { resolve } from 'node:path';
import type { Command } from 'commander';
import { JsonLinesWriter } from '../adapters/recording/lines.js';
import type { UnitDefinition } from '../core/definitions.js';
import { limitedAnswers } from '../core/plan/limitedBy.js';
import { advance, hoursDue, startUnit } from '../core/unit.js';
import { RockhourError } from '../errors.js';
import { replayLine } from './replayLine.js';
import { loadUnit } from './site.js';
import { parseDuration_s, parsePowers_W } from './values.js';
import { tellCounts, walkRecording } from './walk.js';

interface ReplayOptions {
  readonly config: string;
  readonly recording: string;
  readonly out: string;
  readonly unit?: string;
  readonly hoursAt?: string;
  readonly hoursEvery?: string;
  readonly json?: boolean;
}

/**
 * Says at which scans which powers are asked for: at the first, then once per interval; without
 * options none. --hours-every alone asks the powers of the configuration.
 */
function asker(unit: UnitDefinition, options: ReplayOptions) {
  const { hoursAt, hoursEvery } = options;
  const asked = hoursAt !== undefined || hoursEvery !== undefined;
  const own = asked ? unit.hours_at_W : [];
  const powers_W = hoursAt === undefined ? own : parsePowers_W('--hours-at', hoursAt);
  if (hoursEvery !== undefined && powers_W.length === 0) {
    throw new RockhourError(
      'USAGE',
      `unit ${unit.id} has no powers for its hours, so --hours-every needs --hours-at`,
    );
  }
  const clock =
    hoursEvery === undefined
      ? unit
      : { ...unit, hours_every_s: parseDuration_s('--hours-every', hoursEvery) };
  let last_ms: number | null = null;
  return (time_ms: number): readonly number[] => {
    const due = hoursDue(clock, last_ms, time_ms);
    last_ms = time_ms;
    return due ? powers_W : [];
  };
}

interface Summary {
  unit: string;
  rows: number;
  lines: number;
  from: string | null;
  to: string | null;
  raised: Record<string, number>;
  qualities: Record<string, number>;
  /** Answers of hours whose power a limit keeps the unit from, by power and limit. */
  limited: Record<string, number>;
  seconds: number;
  notes: string[];
}

function count(tally: Record<string, number>, key: string): void {
  tally[key] = (tally[key] ?? 0) + 1;
}

function words(tally: Record<string, number>): string {
  return Object.entries(tally)
    .map(([key, n]) => `${key} ${n}`)
    .join(', ');
}

function tell(summary: Summary, out: string): void {
  const span = summary.from === null ? '' : `, ${summary.from} to ${summary.to}`;
  const lines = [
    `${summary.unit}: ${summary.rows} rows read, ${summary.lines} lines written to ${out}${span}, in ${summary.seconds.toFixed(1)} s`,
    `quality: ${words(summary.qualities) || 'no scan'}`,
    `raised: ${words(summary.raised) || 'nothing'}`,
    ...(Object.keys(summary.limited).length === 0
      ? []
      : [`hours at powers that a limit binds, answered all the same: ${words(summary.limited)}`]),
    ...summary.notes,
  ];
  process.stderr.write(`${lines.join('\n')}\n`);
}

async function replay(options: ReplayOptions): Promise<void> {
  if (options.out !== '-' && resolve(options.out) === resolve(options.recording)) {
    throw new RockhourError('USAGE', `--out and --recording are the same file, ${options.out}`);
  }
  if (options.json && options.out === '-') {
    throw new RockhourError('USAGE', '--json and --out - would both write to standard output');
  }
  const { unit, otherChannels } = loadUnit(options.config, options.unit);
  const powersFor = asker(unit, options);
  const summary: Summary = {
    unit: unit.id,
    rows: 0,
    lines: 0,
    from: null,
    to: null,
    raised: {},
    qualities: {},
    limited: {},
    seconds: 0,
    notes: [],
  };
  const started = performance.now();
  const state = startUnit(unit);
  const writer = new JsonLinesWriter(options.out);
  try {
    const reader = await walkRecording(options.recording, unit, otherChannels, (scan) => {
      const step = advance(unit, state, scan, {
        hours_at_W: powersFor(scan.time_ms),
        profile: false,
      });
      summary.from ??= step.estimate.time;
      summary.to = step.estimate.time;
      count(summary.qualities, step.estimate.quality);
      for (const event of step.events)
        if (event.transition === 'raised') count(summary.raised, event.kind);
      const { time, dispatch = [] } = step.estimate;
      for (const { power_MW, limited_by } of limitedAnswers(unit, time, dispatch))
        if (limited_by !== null) count(summary.limited, `${power_MW} MW ${limited_by}`);
      return writer.write(replayLine(step));
    });
    summary.rows = reader.counts.rows;
    summary.notes = tellCounts(reader);
  } catch (fault) {
    // The lines of the rows before it stay.
    if (writer.lines > 0) await writer.close();
    throw fault;
  }
  await writer.close();
  summary.lines = writer.lines;
  summary.seconds = (performance.now() - started) / 1000;
  if (options.json) process.stdout.write(`${JSON.stringify(summary)}\n`);
  else tell(summary, options.out === '-' ? 'standard output' : options.out);
}

export function register(program: Command): void {
  program
    .command('replay')
    .description('run a recording through the estimator: one JSON line per row')
    .requiredOption('--config <file>', 'configuration of the site (YAML)')
    .requiredOption('--recording <file>', 'CSV after RFC 4180: a column time and one per channel')
    .requiredOption('--out <file>', 'JSON Lines to write, - for standard output')
    .option('--unit <id>', 'unit to run; needed where the site has several')
    .option(
      '--hours-at <MW>',
      'powers for which hours are computed, such as 2,3 (default: as configured)',
    )
    .option(
      '--hours-every <span>',
      'how often, such as 30min (default: as configured for the unit)',
    )
    .option('--json', 'summary as one line of JSON on standard output')
    .action(replay);
}
