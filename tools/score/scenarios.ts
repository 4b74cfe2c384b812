import type { PlantChange } from '../../test/plant/faults.js';
import type { PlantGeometry } from '../../test/plant/geometry.js';
import { scheduleFor } from '../../test/plant/schedules.js';
import type { Segment } from '../../test/plant/truth.js';
import type { ErrorModel, SensorSet } from './sensorSets.js';

const H = 3600;

/** One run of the plant per seed, whose recording any number of scenarios share. */
export interface TruthPlan {
  readonly id: string;
  readonly machine: 'known' | 'random';
  readonly segments: (geometry: PlantGeometry) => readonly Segment[];
  readonly changes?: (seed: number) => readonly PlantChange[];
  /** True hours are kept this often [min]. */
  readonly hours_every_min: number | null;
}

/** One line of the table: what reads the recording of a scenario. */
export interface RowPlan {
  readonly id: string;
  readonly set: SensorSet;
  readonly errors: ErrorModel;
}

export interface Scenario {
  readonly id: string;
  readonly words: string;
  readonly truth: TruthPlan;
  /** Only every so many seeds run it; 1 = all. */
  readonly every: number;
  readonly rows: readonly RowPlan[];
  readonly hours: boolean;
  /** When the first full cycle is over [h]; a drawn machine is scored on hours from then on. */
  readonly cycle_h: number;
  /** Nothing is wrong with any sensor. */
  readonly healthy: boolean;
}

const day = (machine: 'known' | 'random'): TruthPlan => ({
  id: `day-${machine}`,
  machine,
  segments: (g) => scheduleFor('day', g, 24 * H),
  hours_every_min: 60,
});

const row = (set: SensorSet, errors: ErrorModel): RowPlan => ({
  id: `${set}-${errors}`,
  set,
  errors,
});

export const SCENARIOS: readonly Scenario[] = [
  {
    id: 'nominal',
    words: 'nominal day, machine known',
    truth: day('known'),
    every: 1,
    rows: [row('all', 'independent'), row('five', 'independent'), row('three', 'independent')],
    hours: true,
    cycle_h: 12.5,
    healthy: true,
  },
  {
    id: 'nominal-random',
    words: 'nominal day, machine drawn',
    truth: day('random'),
    every: 1,
    rows: [row('all', 'class'), row('five', 'class'), row('three', 'class')],
    hours: true,
    cycle_h: 12.5,
    healthy: true,
  },
];
