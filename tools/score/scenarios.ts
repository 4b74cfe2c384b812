import { CHANNELLING } from './own/channelling.js';
import { DAYS, QUICK_CYCLE } from './own/days.js';
import { FAULTS, QUICK_FAULTS } from './own/faults.js';
import { GAP } from './own/gap.js';
import { HEAT_TRANSFER } from './own/heatTransfer.js';
import { LEAK } from './own/leak.js';
import { METER_STEP } from './own/meterStep.js';
import { RESTART } from './own/restart.js';
import { SCANS } from './own/scans.js';
import { SETTLED } from './own/settled.js';
import type { Scenario } from './scenario.js';

export const SCENARIOS: readonly Scenario[] = [
  ...DAYS,
  FAULTS,
  METER_STEP,
  GAP,
  ...CHANNELLING,
  ...HEAT_TRANSFER,
  SCANS,
  RESTART,
  LEAK,
  SETTLED,
];

/** Short scenarios whose goals for each single run are part of the tests. */
export const QUICK: readonly Scenario[] = [
  QUICK_CYCLE,
  QUICK_FAULTS,
  ...['gap', 'channel-22', 'transfer-16'].map((id): Scenario => {
    const long = SCENARIOS.find((s) => s.id === id)!;
    return { ...long, id: `quick-${id}`, rows: long.rows.slice(0, 1) };
  }),
];

export const ALL_SCENARIOS: readonly Scenario[] = [...SCENARIOS, ...QUICK];
