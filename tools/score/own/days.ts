import { scheduleFor } from '../../../test/plant/schedules.js';
import { base, cycle, day, H, row } from '../base.js';
import { withKnownMachine } from '../knownMachine.js';
import type { Scenario } from '../scenario.js';
import { plain } from './plain.js';

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
    words: 'week of partial cycles',
    truth: {
      id: 'week',
      machine: 'random',
      segments: (g) => scheduleFor('partial', g, 7 * 24 * H),
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
