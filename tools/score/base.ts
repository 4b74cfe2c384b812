import type { PlantGeometry } from '../../test/plant/geometry.js';
import { scheduleFor } from '../../test/plant/schedules.js';
import type { Segment } from '../../test/plant/truth.js';
import { plain } from './own/plain.js';
import type { RowPlan, TruthPlan } from './scenario.js';
import type { ErrorModel, SensorSet } from './sensorSets.js';

export const H = 3600;

export const row = (set: SensorSet, errors: ErrorModel): RowPlan => ({
  id: `${set}-${errors}`,
  set,
  errors,
});

export const day = (machine: 'known' | 'random'): TruthPlan => ({
  id: `day-${machine}`,
  machine,
  segments: (g) => scheduleFor('day', g, 24 * H),
  hours_every_min: 60,
});

/** A charge, a short rest, most of a discharge and another charge: enough for one cycle. */
export const cycle = ({ rated_power_W: P }: PlantGeometry): Segment[] => [
  { mode: 'charge', power_W: 1.5 * P, duration_s: 5 * H },
  { mode: 'stand', duration_s: 0.5 * H },
  { mode: 'discharge', power_W: P, duration_s: 4 * H },
  { mode: 'charge', power_W: 1.4 * P, duration_s: 4 * H },
];

/** What most scenarios have in common. */
export const base = {
  every: 1,
  figures: () => [],
  hours: true,
  cycle_h: 12.5,
  healthy: true,
  goals: 'sensors',
  run: plain(true),
} as const;
