import { existsSync, mkdirSync } from 'node:fs';
import { join } from 'node:path';
import {
  createTruth,
  type ScanReadings,
  type Segment,
  type Truth,
} from '../../test/plant/truth.js';
import { folder } from '../score/folder.js';
import { Recording } from '../score/recording.js';
import {
  BRANCHES,
  type Branch,
  branchSegments,
  changesOf,
  faultsOf,
  GEOMETRY,
  HEALTHY,
  leadSegments,
  ONSETS,
  type Onset,
  waySegments,
} from './branches.js';
import { weekSegments, weekWeather } from './weeks.js';

/** A stretch of a seed's truth: the lead, the way on, a branch, or healthy weeks. */
export type Stretch = Onset | 'weeks' | string;

const ALL: readonly Branch[] = [...BRANCHES, HEALTHY];

const fileOf = (seed: number, stretch: Stretch, hash: string): string =>
  join(folder, 'watch', `truth-${hash}`, `${seed}-${stretch}.bin`);

/** Kept recording of a stretch; null where it has not been made. */
export const keptStretch = (seed: number, stretch: Stretch, hash: string): Recording | null =>
  Recording.load(fileOf(seed, stretch, hash));

/**
 * Makes what is missing of a seed's lead, way and branches, each on a copy of the plant at its onset.
 *
 * @param hash of the code that makes them, see codeHash
 * @param only this branch, or lead, and what comes before it
 * @returns simulated days made now
 */
export function makeBranches(seed: number, hash: string, only?: string): number {
  const wanted = ALL.filter(({ id }) => only === undefined || id === only);
  const missing = wanted.filter(({ id }) => !existsSync(fileOf(seed, id, hash)));
  const last = wanted.some(({ onset }) => onset === 'way') ? 'way' : 'lead';
  const onsets = ONSETS.slice(0, ONSETS.indexOf(last) + 1);
  const healthy = onsets.some((id) => !existsSync(fileOf(seed, id, hash)));
  if (missing.length === 0 && !healthy) return 0;
  const plant = createTruth({ seed, geometry: GEOMETRY });
  let days = 0;
  const record = (at: Truth, stretch: Stretch, segments: readonly Segment[]): void => {
    days += keep(at, fileOf(seed, stretch, hash), segments);
  };
  for (const onset of onsets) {
    record(plant, onset, onset === 'lead' ? leadSegments(seed) : waySegments(seed));
    for (const branch of missing.filter((one) => one.onset === onset)) {
      const at_s = plant.elapsed_s;
      const changes = changesOf(branch, seed, at_s);
      const copy = plant.clone({ changes, faults: faultsOf(branch, at_s) });
      record(copy, branch.id, branchSegments(branch, seed));
    }
  }
  return days;
}

/** Makes the healthy weeks of a seed where they are missing; simulated days made now. */
export function makeWeeks(seed: number, hash: string): number {
  const file = fileOf(seed, 'weeks', hash);
  if (existsSync(file)) return 0;
  const plant = createTruth({ seed, geometry: GEOMETRY, changes: weekWeather(seed) });
  return keep(plant, file, weekSegments(seed));
}

/** Runs a plant and keeps its recording; simulated days. */
function keep(plant: Truth, file: string, segments: readonly Segment[]): number {
  const start_s = plant.time_s;
  const scans: ScanReadings[] = [];
  const truths: number[][] = [];
  plant.run(segments, (scan, { stores }) => {
    scans.push(scan);
    truths.push([stores.hot?.soc ?? Number.NaN, stores.cold?.soc ?? Number.NaN]);
  });
  const kelvins = new Set(
    GEOMETRY.channels
      .filter((c) => c.measures === 'gas_temperature' || c.measures === 'ambient_temperature')
      .map((c) => c.id),
  );
  const channels = new Set(GEOMETRY.channels.map((c) => c.id));
  const ids = Object.keys(scans[0]?.readings ?? {});
  const recording = Recording.make(scans, truths, {
    start_s,
    period_s: GEOMETRY.scan_period_s,
    truths: ['hot.soc', 'cold.soc'],
    hours: [],
    temperatures: ids.filter((id) => !channels.has(id) || kelvins.has(id)),
    others: ids.filter((id) => channels.has(id) && !kelvins.has(id)),
  });
  recording.save(file);
  return (scans.length * GEOMETRY.scan_period_s) / 86_400;
}

/** The folder of the truths made by this code. */
export function prepareTruths(hash: string): void {
  mkdirSync(join(folder, 'watch', `truth-${hash}`), { recursive: true });
}
