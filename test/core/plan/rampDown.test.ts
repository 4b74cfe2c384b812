import { describe, expect, it } from 'vitest';
import { commandOf } from '../../../src/core/plan/command.js';
import type { Episode } from '../../../src/core/plan/episode.js';
import type { Leg } from '../../../src/core/plan/leg.js';
import { createOutlook } from '../../../src/core/plan/outlook.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { watchedUnit } from '../dispatch/fullUnit.js';
import { unitOf } from '../track/plants.js';

const plain = unitOf();
/** 60 kW in 20 min. */
const unit = unitOf({
  limits: {
    ...plain.limits,
    operation: {
      ramp_W_s: { charge: 50, discharge: 50 },
      start: {
        warm: { time_s: 0, energy_J: 0 },
        cold: { time_s: 0, energy_J: 0 },
        cold_after_s: Number.POSITIVE_INFINITY,
      },
      change_over_s: 0,
    },
  },
});
const state = watchedUnit(unit, { hot: 0.6, cold: 0.6 }, 3);
const before = { mode: 'stand', power_W: 0, stood_s: 7200, last: null } as const;
const HOUR = 3600;

function run(legs: readonly Leg[], end_s: number): Episode {
  const outlook = createOutlook(unitModel(unit), state);
  const command = commandOf(unit, legs, [], before, end_s);
  return outlook.march(command, {}, { beyond_s: 6 * HOUR }).episodes[0]!;
}

describe('a run that ramps down at its end', () => {
  const legs: Leg[] = [{ mode: 'discharge', power_W: 60e3, from_s: 0, to_s: HOUR }];

  it('has the reserve of its last power, as if that went on', () => {
    const ended = run(legs, 4 * HOUR);
    expect(ended).toMatchObject({ held_s: HOUR, to_s: HOUR + 1200, stopped_s: null });
    // An edge at the same time, so that both take the same steps.
    const open = { ...legs[0]!, from_s: HOUR, to_s: Number.POSITIVE_INFINITY };
    const goesOn = run([...legs, open], 10 * HOUR);
    expect(goesOn.first_s).toBeGreaterThan(2 * HOUR);
    expect(ended.first_s).toBe(goesOn.first_s);
    expect(ended.ends_by).toBe(goesOn.ends_by);
  });

  it('has none where a rule breaks before its end', () => {
    const { first_s } = run([{ ...legs[0]!, to_s: 9 * HOUR }], 10 * HOUR);
    const long = run([{ ...legs[0]!, to_s: first_s + HOUR }], 12 * HOUR);
    expect(long.stopped_s).toBe(long.first_s);
    expect(long.first_s).toBeLessThan(long.held_s);
  });
});
