import type { PlantChange } from '../../test/plant/faults.js';
import type { PlantGeometry } from '../../test/plant/geometry.js';
import type { Segment } from '../../test/plant/truth.js';
import type { Figure } from './figure.js';
import type { Recording } from './recording.js';
import type { ErrorModel, SensorSet } from './sensorSets.js';
import type { RowResult } from './tally.js';

/** One run of the plant per seed, whose recording any number of scenarios share. */
export interface TruthPlan {
  readonly id: string;
  readonly machine: 'known' | 'random';
  /** Scan period of the recording; SCAN_S if absent. */
  readonly period_s?: number;
  readonly segments: (geometry: PlantGeometry, seed: number) => readonly Segment[];
  readonly changes?: (seed: number) => readonly PlantChange[];
  /** True hours are kept this often [min]; null = never. */
  readonly hours_every_min: number | null;
}

/** One block of the table: who reads the recording of a scenario. */
export interface RowPlan {
  readonly id: string;
  readonly set: SensorSet;
  readonly errors: ErrorModel;
  /** What sets this row apart from others with the same sensors. */
  readonly words?: string;
  /** Figures without goals, where too little is read for those of the sensor set. */
  readonly plain?: true;
}

/** Runs some rows of a scenario on one recording. */
export type Runner = (
  recording: Recording,
  seed: number,
  rows: readonly RowPlan[],
) => Readonly<Record<string, RowResult>>;

export interface Scenario {
  readonly id: string;
  /** Name of its module in own/: its results are kept for as long as that does the same. */
  readonly code: string;
  readonly words: string;
  readonly truth: TruthPlan;
  /** Only every so many seeds run it; 1 = all. */
  readonly every: number;
  readonly rows: readonly RowPlan[];
  readonly run: Runner;
  /** Figures of its own, before those that all rows have. */
  readonly figures: (row: RowPlan, results: readonly RowResult[]) => readonly Figure[];
  /** Hours are answered and scored. */
  readonly hours: boolean;
  /** When the first full cycle is over [h]; a drawn machine is scored on hours from then on. */
  readonly cycle_h: number;
  /** Nothing is wrong with any sensor: whoever is rejected is rejected wrongly. */
  readonly healthy: boolean;
  /**
   * Which goals hold for the figures that all rows have: those for the sensor set, only a greatest
   * rms of the state of charge [%], or none.
   */
  readonly goals: 'sensors' | { readonly soc_rms: number } | 'none';
}
