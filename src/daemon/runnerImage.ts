import type { StoredCheckpoint } from '../adapters/history/checkpoints.js';
import type { AssemblerSnapshot } from '../core/scan/assemble.js';
import type { ZoneState } from '../core/scan/zones.js';
import type { UnitSnapshot } from '../core/unit.js';
import type { UnitShape } from '../core/unitShape.js';
import type { WatchEvent } from '../core/watch/event.js';
import type { ClockReturnState } from './clockReturn.js';

/** What a checkpoint holds: estimator and open scans, as of one journal entry. */
export interface RunnerImage {
  readonly unit: UnitSnapshot;
  readonly assembler: AssemblerSnapshot;
  /** Of the definition it was saved under; absent in one saved before it was told. */
  readonly shape?: UnitShape;
  /** What this state has raised and not returned, as it was raised; absent as above. */
  readonly standing?: readonly WatchEvent[];
  /** Absent as above. */
  readonly zones?: ZoneState;
  /** Absent as above, and in one that was put aside. */
  readonly clocks?: ClockReturnState;
}

/** A state saved under another definition, to be taken over where the journal has come to its time. */
export interface Awaited {
  readonly image: DescribedImage;
  readonly time_ms: number;
  /** What is told as raised. */
  readonly standing: readonly WatchEvent[];
}

export type DescribedImage = RunnerImage & { readonly shape: UnitShape };

/** Throws where the checkpoint is damaged, or does not tell its definition. */
export function describedImage(checkpoint: StoredCheckpoint): DescribedImage {
  const { shape, ...image } = checkpoint.load() as RunnerImage;
  if (shape === undefined) throw new RangeError('it does not tell its definition');
  return { ...image, shape };
}
