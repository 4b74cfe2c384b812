import type { PlantGeometry } from '../../test/plant/geometry.js';
import { scheduleFor } from '../../test/plant/schedules.js';
import type { Segment } from '../../test/plant/truth.js';
import { channel, channellingFigures, channellingOwn } from './own/channelling.js';
import { FAULT_ROWS, faultFigures, runFaults } from './own/faults.js';
import { gapFigures, runGap } from './own/gap.js';
import { heatTransferFigures, heatTransferOwn, poorTransfer } from './own/heatTransfer.js';
import { meterStepFigures, runMeterStep } from './own/meterStep.js';
import { plain } from './own/plain.js';
import type { RowPlan, Scenario, TruthPlan } from './scenario.js';
import type { ErrorModel, SensorSet } from './sensorSets.js';

const H = 3600;

const row = (set: SensorSet, errors: ErrorModel): RowPlan => ({
  id: `${set}-${errors}`,
  set,
  errors,
});

const day = (machine: 'known' | 'random'): TruthPlan => ({
  id: `day-${machine}`,
  machine,
  segments: (g) => scheduleFor('day', g, 24 * H),
  hours_every_min: 60,
});

/** A charge, a short rest, most of a discharge and another charge: enough for one cycle. */
const cycle = ({ rated_power_W: P }: PlantGeometry): Segment[] => [
  { mode: 'charge', power_W: 1.5 * P, duration_s: 5 * H },
  { mode: 'stand', duration_s: 0.5 * H },
  { mode: 'discharge', power_W: P, duration_s: 4 * H },
  { mode: 'charge', power_W: 1.4 * P, duration_s: 4 * H },
];

/**
 * Four hours of charge, of which the last is unseen, and an unseen discharge; the gap ends while the
 * unit stands with even seeds and while it still discharges with odd ones.
 */
const gap = ({ rated_power_W: P }: PlantGeometry, seed: number): Segment[] => {
  const discharge_h = seed % 2 === 0 ? 2 : 3;
  return [
    { mode: 'charge', power_W: 1.5 * P, duration_s: 4 * H },
    { mode: 'discharge', power_W: P, duration_s: discharge_h * H },
    { mode: 'stand', duration_s: (3 - discharge_h + 0.5) * H },
    { mode: 'charge', power_W: 1.3 * P, duration_s: 2.5 * H },
  ];
};

const NOTHING_OWN = () => [];
const base = {
  every: 1,
  figures: NOTHING_OWN,
  hours: true,
  cycle_h: 12.5,
  healthy: true,
  goals: 'sensors',
  run: plain(true),
} as const;

const CHANNELS = [5, 10, 22] as const;
const TRANSFERS = [70, 50, 16] as const;

export const SCENARIOS: readonly Scenario[] = [
  {
    ...base,
    id: 'nominal',
    words: 'nominal day, machine known',
    truth: day('known'),
    rows: [row('all', 'independent'), row('five', 'independent'), row('three', 'independent')],
  },
  {
    ...base,
    id: 'nominal-random',
    words: 'nominal day, machine drawn',
    truth: day('random'),
    rows: [row('all', 'class'), row('five', 'class'), row('three', 'class')],
  },
  {
    ...base,
    id: 'week',
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
  {
    ...base,
    id: 'faults',
    words: 'sensor fault',
    truth: day('random'),
    rows: FAULT_ROWS,
    // To the end of the first discharge.
    run: runFaults(12.5),
    figures: faultFigures,
    hours: false,
    healthy: false,
    goals: 'none',
  },
  {
    ...base,
    id: 'meter-step',
    words: 'flow meter -7 % from 7 h on',
    truth: day('random'),
    rows: [row('all', 'class'), row('five', 'class')],
    run: runMeterStep,
    figures: (_, results) => meterStepFigures(results),
    goals: 'none',
  },
  {
    ...base,
    id: 'gap',
    words: 'gap of 3.5 h, unseen change of mode',
    truth: { id: 'gap', machine: 'random', segments: gap, hours_every_min: null },
    rows: [row('all', 'independent'), row('five', 'independent'), row('all', 'class')],
    run: runGap,
    figures: ({ errors }, results) => gapFigures(errors === 'independent', results),
    hours: false,
    goals: 'none',
  },
  ...CHANNELS.map(
    (percent): Scenario => ({
      ...base,
      id: `channel-${percent}`,
      words: `channelling of ${percent} %`,
      truth: {
        id: `channel-${percent}`,
        machine: 'random',
        segments: cycle,
        changes: channel(percent / 100),
        hours_every_min: null,
      },
      rows: [row('all', 'independent')],
      run: plain(false, channellingOwn),
      figures: (_, results) => channellingFigures(results),
      hours: false,
      goals: { soc_rms: 0.2 },
    }),
  ),
  ...TRANSFERS.map(
    (percent): Scenario => ({
      ...base,
      id: `transfer-${percent}`,
      words: `heat transfer at ${percent} %`,
      truth: {
        id: `transfer-${percent}`,
        machine: 'random',
        segments: cycle,
        changes: poorTransfer(percent / 100),
        hours_every_min: null,
      },
      rows: [row('all', 'independent')],
      run: plain(false, heatTransferOwn),
      figures: (_, results) => heatTransferFigures(results),
      hours: false,
      goals: 'none',
    }),
  ),
];

const short = {
  id: 'quick-cycle',
  machine: 'random',
  segments: cycle,
  hours_every_min: 120,
} as const;
const QUICK_FAULTS = ['open', 'stuck', 'offset', 'swapped', 'card'];

/** Short scenarios whose goals for each single run are part of the tests. */
export const QUICK: readonly Scenario[] = [
  {
    ...base,
    id: 'quick-cycle',
    words: 'one cycle, machine drawn',
    truth: short,
    rows: [row('all', 'independent'), row('five', 'independent')],
    cycle_h: 9.5,
  },
  {
    ...base,
    id: 'quick-faults',
    words: 'sensor fault',
    truth: short,
    rows: FAULT_ROWS.filter((r) => QUICK_FAULTS.includes(r.id)),
    run: runFaults(7.5),
    figures: faultFigures,
    hours: false,
    healthy: false,
    goals: 'none',
  },
  ...['gap', 'channel-22', 'transfer-16'].map((id): Scenario => {
    const long = SCENARIOS.find((s) => s.id === id)!;
    return { ...long, id: `quick-${id}`, rows: long.rows.slice(0, 1) };
  }),
];

export const ALL_SCENARIOS: readonly Scenario[] = [...SCENARIOS, ...QUICK];
