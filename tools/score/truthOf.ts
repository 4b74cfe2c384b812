import { createHash } from 'node:crypto';
import { existsSync } from 'node:fs';
import { join } from 'node:path';
import { folder } from './folder.js';
import { makeTruth, type TruthInput } from './makeTruth.js';
import { Recording } from './recording.js';
import type { TruthPlan } from './scenario.js';
import { truthGeometry } from './truthPlant.js';

/** Where the recording of a plan and a seed is kept, and what it is made of. */
function keptAs(plan: TruthPlan, seed: number, hash: string): { file: string; input: TruthInput } {
  const geometry = truthGeometry(plan.period_s);
  const input: TruthInput = {
    seed,
    machine: plan.machine,
    geometry,
    segments: plan.segments(geometry, seed),
    changes: plan.changes?.(seed) ?? [],
    hours_every_min: plan.hours_every_min,
  };
  // Plans are part of the name by their content, so that an edited schedule is another truth.
  const content = createHash('sha256').update(JSON.stringify(input)).digest('hex').slice(0, 8);
  return { file: join(folder, 'truth', hash, `${plan.id}-${content}-${seed}.bin`), input };
}

/** Whether the recording of a plan and a seed is in the cache. */
export function truthIsKept(plan: TruthPlan, seed: number, hash: string): boolean {
  return existsSync(keptAs(plan, seed, hash).file);
}

/** The recording of a plan and a seed, from the cache where it is there. */
export function truthOf(plan: TruthPlan, seed: number, hash: string): Recording {
  const { file, input } = keptAs(plan, seed, hash);
  const kept = Recording.load(file);
  if (kept) return kept;
  const recording = makeTruth(input);
  recording.save(file);
  return recording;
}
