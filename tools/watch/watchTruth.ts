import { createHash } from 'node:crypto';
import { existsSync, mkdirSync } from 'node:fs';
import { join } from 'node:path';
import type { PlantChange, SensorFault } from '../../test/plant/faults.js';
import type { Segment, Truth } from '../../test/plant/truth.js';
import { folder } from '../score/folder.js';
import { Recording } from '../score/recording.js';
import {
  BRANCHES,
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
import { branchOff, recordPlant, startPlant } from './plantRun.js';
import { weekSegments, weekWeather } from './weeks.js';

/** A stretch of a seed's truth: the lead, the way on, a branch by its id, or healthy weeks. */
export type Stretch = Onset | 'weeks' | string;

/** Module that a truth is made by; its plan is part of the name of its file. */
export const TRUTH_CODE = 'tools/watch/plantRun.ts';

/** All that a stretch is made of; plain data, so that its text names it in the cache. */
export interface StretchPlan {
  /** Stretches before it, from the start of the plant. */
  readonly before: readonly (readonly Segment[])[];
  readonly segments: readonly Segment[];
  readonly changes: readonly PlantChange[];
  readonly faults: readonly SensorFault[];
}

/** Segments are cut to whole scan periods, as the plant cuts them. */
function lengthOf(stretches: readonly (readonly Segment[])[]): number {
  const { scan_period_s } = GEOMETRY;
  return stretches
    .flat()
    .reduce((sum, s) => sum + scan_period_s * Math.round(s.duration_s / scan_period_s), 0);
}

/** @throws RangeError for a stretch that there is not */
export function planOf(seed: number, stretch: Stretch): StretchPlan {
  const nothing = { changes: [], faults: [] };
  const lead = leadSegments(seed);
  const way = waySegments(seed);
  if (stretch === 'lead') return { ...nothing, before: [], segments: lead };
  if (stretch === 'way') return { ...nothing, before: [lead], segments: way };
  if (stretch === 'weeks')
    return { before: [], segments: weekSegments(seed), changes: weekWeather(seed), faults: [] };
  const branch = [...BRANCHES, HEALTHY].find((one) => one.id === stretch);
  if (branch === undefined) throw new RangeError(`stretch ${stretch} is not known`);
  const before = branch.onset === 'lead' ? [lead] : [lead, way];
  const at_s = lengthOf(before);
  return {
    before,
    segments: branchSegments(branch, seed),
    changes: changesOf(branch, seed, at_s),
    faults: faultsOf(branch, at_s),
  };
}

function fileOf(seed: number, stretch: Stretch, hash: string): string {
  const text = JSON.stringify([GEOMETRY, planOf(seed, stretch)]);
  const content = createHash('sha256').update(text).digest('hex').slice(0, 8);
  return join(folder, 'watch', `truth-${hash}`, `${seed}-${stretch}-${content}.bin`);
}

const isKept = (seed: number, stretch: Stretch, hash: string): boolean =>
  existsSync(fileOf(seed, stretch, hash));

/** Kept recording of a stretch; null where it has not been made. */
export const keptStretch = (seed: number, stretch: Stretch, hash: string): Recording | null =>
  Recording.load(fileOf(seed, stretch, hash));

/**
 * Makes what is missing of a seed's lead, way and branches, each on a copy of the plant at its onset.
 *
 * @param hash of TRUTH_CODE, see codeHash
 * @param ids of the branches that are wanted; the lead comes in any case
 * @returns simulated days made now
 */
export function makeBranches(seed: number, hash: string, ids: readonly string[]): number {
  const wanted = [...BRANCHES, HEALTHY].filter(({ id }) => ids.includes(id));
  const missing = wanted.filter(({ id }) => !isKept(seed, id, hash));
  const last = wanted.some(({ onset }) => onset === 'way') ? 'way' : 'lead';
  const onsets = ONSETS.slice(0, ONSETS.indexOf(last) + 1);
  if (missing.length === 0 && onsets.every((id) => isKept(seed, id, hash))) return 0;
  const plant = startPlant(seed, GEOMETRY, []);
  let days = 0;
  for (const onset of onsets) {
    days += keep(plant, seed, onset, hash);
    for (const { id } of missing.filter((one) => one.onset === onset)) {
      const { changes, faults } = planOf(seed, id);
      days += keep(branchOff(plant, changes, faults), seed, id, hash);
    }
  }
  return days;
}

/** Makes the healthy weeks of a seed where they are missing; simulated days made now. */
export function makeWeeks(seed: number, hash: string): number {
  if (isKept(seed, 'weeks', hash)) return 0;
  return keep(startPlant(seed, GEOMETRY, planOf(seed, 'weeks').changes), seed, 'weeks', hash);
}

/** Runs a plant over a stretch and keeps its recording; simulated days. */
function keep(plant: Truth, seed: number, stretch: Stretch, hash: string): number {
  const recording = recordPlant(plant, planOf(seed, stretch).segments);
  recording.save(fileOf(seed, stretch, hash));
  return (recording.header.scans * recording.header.period_s) / 86_400;
}

/** The folder of the truths made by this code. */
export function prepareTruths(hash: string): void {
  mkdirSync(join(folder, 'watch', `truth-${hash}`), { recursive: true });
}
