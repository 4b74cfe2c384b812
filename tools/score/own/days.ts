import type { WeatherChange } from '../../../test/plant/faults.js';
import { RandomStream } from '../../../test/plant/random.js';
import { scheduleFor } from '../../../test/plant/schedules.js';
import { base, cycle, day, H, row } from '../base.js';
import { withKnownMachine } from '../knownMachine.js';
import type { Scenario } from '../scenario.js';
import { plain } from './plain.js';

/**
 * Warm and cold days: gas comes to the machine as warm as the coolers leave it, so that what enters the
 * stores changes by some 2.4 times as much in the hot and 0.5 times in the cold one.
 */
function weatherOf(seed: number): WeatherChange[] {
  const random = new RandomStream(seed, 'score week weather');
  return [1, 2, 3, 4, 5].map((day) => ({
    kind: 'weather',
    at_s: (day + random.uniform(-0.3, 0.3)) * 24 * H,
    // There and back, so that it stays within a season.
    offset_K: (day % 2 === 1 ? 1 : -1) * random.uniform(4, 9),
    ramp_s: random.uniform(2, 8) * H,
  }));
}

/** Healthy plants on ordinary days, in a long week and at rest. */
export const DAYS: readonly Scenario[] = [
  {
    ...base,
    id: 'nominal',
    code: 'days',
    words: 'nominal day, machine known',
    truth: day('known'),
    rows: [row('all', 'independent'), row('five', 'independent'), row('three', 'independent')],
    run: plain(true, undefined, withKnownMachine),
  },
  {
    ...base,
    id: 'nominal-random',
    code: 'days',
    words: 'nominal day, machine drawn',
    truth: day('random'),
    rows: [row('all', 'class'), row('five', 'class'), row('three', 'class')],
  },
  {
    ...base,
    id: 'week',
    code: 'days',
    words: 'week of partial cycles, power and inlet gas changing',
    truth: {
      id: 'week',
      machine: 'random',
      segments: (g) => scheduleFor('partial', g, 7 * 24 * H),
      changes: weatherOf,
      hours_every_min: 180,
    },
    every: 3,
    rows: [row('all', 'class'), row('five', 'class')],
    cycle_h: 7.5,
  },
  {
    ...base,
    id: 'standing',
    code: 'days',
    words: 'charged, then 36 h standing',
    truth: {
      id: 'standing',
      machine: 'random',
      segments: (g) => scheduleFor('standing', g, 44 * H),
      hours_every_min: 120,
    },
    rows: [row('all', 'class'), row('five', 'class')],
    // No discharge is over before the end.
    cycle_h: Number.POSITIVE_INFINITY,
  },
];

/** Short enough for the quick run. */
export const QUICK_CYCLE: Scenario = {
  ...base,
  id: 'quick-cycle',
  code: 'days',
  words: 'one cycle, machine drawn',
  truth: { id: 'quick-cycle', machine: 'random', segments: cycle, hours_every_min: 120 },
  rows: [row('all', 'independent'), row('five', 'independent')],
  cycle_h: 9.5,
};
