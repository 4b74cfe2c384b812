import { existsSync, mkdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { commandOf } from '../../src/core/plan/command.js';
import { planContext } from '../../src/core/plan/context.js';
import { createOutlook } from '../../src/core/plan/outlook.js';
import { firstBreaks, spreadOf } from '../../src/core/plan/spread.js';
import { advance, startUnit } from '../../src/core/unit.js';
import { unitModel } from '../../src/core/unitModel.js';
import { StraightLines } from '../../test/score/straightLines.js';
import { folder } from '../score/folder.js';
import { type SensorSet, unitWith } from '../score/sensorSets.js';
import { columnOf } from '../score/twins.js';
import { caseOf, type OfferCase, offerTruth } from './offerTruth.js';

/** What was offered and what was true, of one case with one set of sensors. */
export interface OfferResult extends OfferCase {
  readonly set: SensorSet;
  readonly truth_h: number;
  readonly p90: number;
  readonly p50: number;
  readonly p10: number;
  /** Straight lines, heat over heat rate [h]. */
  readonly line_h: number;
  readonly ms: number;
}

export const SETS: readonly SensorSet[] = ['all', 'five'];

export interface OfferHashes {
  readonly truth: string;
  readonly result: string;
}

/** Offers of the case of a seed, from its recording; kept on disk. */
export function offerResults(seed: number, hashes: OfferHashes): OfferResult[] {
  const place = join(folder, 'offers', `results-${hashes.result}`);
  mkdirSync(place, { recursive: true });
  const file = join(place, `${seed}.json`);
  if (existsSync(file)) return JSON.parse(readFileSync(file, 'utf8')) as OfferResult[];
  const made = SETS.map((set) => offerOf(seed, set, hashes.truth));
  writeFileSync(`${file}.part`, JSON.stringify(made));
  renameSync(`${file}.part`, file);
  return made;
}

function offerOf(seed: number, set: SensorSet, truthHash: string): OfferResult {
  const recording = offerTruth(seed, truthHash);
  const unit = unitWith(set, 'class');
  const model = unitModel(unit);
  const state = startUnit(unit);
  const lines = new StraightLines(unit);
  const columns = unit.channels.map((c) =>
    c.role.kind === 'thermocouple' ? columnOf(c.id, 'class') : c.id,
  );
  const { scans, period_s, hours } = recording.header;
  const nothing = { hours_at_W: [], profile: false };
  for (let n = 0; n < scans; n++) {
    const values = Float64Array.from(columns, (id) => recording.reading(id, n));
    const held = new Uint8Array(values.length);
    advance(unit, state, { time_ms: recording.time_ms(n), values, held }, nothing);
    lines.take(values, period_s);
  }
  const asked = caseOf(seed);
  const truth = hours[0] as (typeof hours)[number];
  const from_s = asked.wait_h * 3600;
  const most_s = from_s + (4 * unit.rated_hours * 3600) / asked.share;
  const { power_W } = truth;
  const leg = { mode: 'discharge', power_W, from_s, to_s: Number.POSITIVE_INFINITY } as const;
  const started = performance.now();
  // Start-up and ramps left out: the true hours are those of a unit that is at power at once.
  const bare = { ...unit, limits: { ...unit.limits } };
  delete (bare.limits as { operation?: unknown }).operation;
  const command = commandOf(bare, [leg], [], planContext(model, state).before, most_s);
  const spread = spreadOf(createOutlook(model, state, asked.share), command);
  const run = spread.course.episodes[0] as (typeof spread.course.episodes)[number];
  const ends = (firstBreaks(spread)[0] as Float64Array).sort();
  const at = (share: number): number =>
    (Math.min(most_s, ends[Math.floor(share * ends.length)] as number) - run.from_s) / 3600;
  return {
    ...asked,
    set,
    truth_h: truth.hours,
    p90: at(0.1),
    p50: at(0.5),
    p10: at(0.9),
    line_h: lines.hours(power_W),
    ms: performance.now() - started,
  };
}
