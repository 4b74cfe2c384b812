import { describe, expect, it } from 'vitest';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { advance, hoursAt, startUnit, type UnitState } from '../../../src/core/unit.js';
import { presentWeighing, type UnitWorth, weighUnit } from '../../../src/core/worth/unitWorth.js';
import { demoUnit } from '../../support/truthRun.js';
import { type Fronts, frontedScan } from '../track/fronted.js';

const plain = demoUnit();
const unit: UnitDefinition = { ...plain, estimator: { ...plain.estimator, cells: 50 } };
const MINUTE_MS = 60_000;

/** A unit that has stood for a quarter of an hour with its fronts somewhere. */
function stoodWith(fronts: Fronts, lost?: string): UnitState {
  const state = startUnit(unit);
  const at = unit.channels.findIndex((channel) => channel.id === lost);
  for (let n = 0; n < 15; n++) {
    const scan = frontedScan(unit, n * MINUTE_MS, fronts, { flow: 0, mode: 0, power: 0 });
    if (at >= 0 && n > 5) scan.values[at] = Number.NaN;
    advance(unit, state, scan, { hours_at_W: [], profile: false });
  }
  return state;
}

function drained(run: Generator<number, UnitWorth>): UnitWorth {
  let next = run.next();
  while (!next.done) next = run.next();
  return next.value;
}

describe('the hours ahead of a unit as it is', () => {
  it('are a discharge at rated power for as long as the hours say', () => {
    const state = stoodWith({ hot: 0.6, cold: 0.6 });
    const weighing = presentWeighing(unit, state)!;
    const { over } = weighing;
    expect(over).toMatchObject({ kind: 'now', mode: 'discharge' });
    const [answer] = hoursAt(unit, state, [unit.rated_power_W]);
    // One mean tube for all: steel of the wall and the plenums, left out, holds percents of the heat.
    const { hours } = over as { hours: number };
    expect(Math.abs(hours / answer!.hours.p50 - 1)).toBeLessThan(0.05);
  });

  it('are a charge where nothing is left to discharge', () => {
    expect(presentWeighing(unit, stoodWith({ hot: -0.3, cold: -0.3 }))!.over).toMatchObject({
      mode: 'charge',
    });
  });

  it('begin with what is known now: at the loss nothing changes, later sigma rises', () => {
    const lost = 'hot_rim_07';
    const state = stoodWith({ hot: 0.6, cold: 0.6 }, lost);
    const before = structuredClone(state);
    const weighing = presentWeighing(unit, state)!;
    expect(weighing.rejected).toMatchObject([{ id: lost, verdict: 'open' }]);
    const first = {
      ...weighing,
      course: { ...weighing.course, steps: weighing.course.steps.slice(0, 1) },
    };
    const [early] = drained(weighUnit(unit, first, [0], 0)).stores;
    const later = drained(weighUnit(unit, weighing, [0], 0)).stores[0]!;
    expect(later.sensors.filter((s) => !s.in_use).map((s) => s.id)).toEqual([lost]);
    for (const string of ['axis', 'middle', 'rim']) {
      const rise = (worth: typeof early) => {
        const { all, string: without } = worth!.strings.find((s) => s.id === string)!;
        return without.soc_sigma_rms / all.soc_sigma_rms;
      };
      expect(rise(early)).toBeGreaterThanOrEqual(1);
      expect(rise(later)).toBeGreaterThan(rise(early));
    }
    expect(state).toEqual(before);
  });

  it('are unknown before every store has started', () => {
    expect(presentWeighing(unit, startUnit(unit))).toBeNull();
  });

  it('are weighed for a store that the unit has', () => {
    const weighing = presentWeighing(unit, stoodWith({ hot: 0.6, cold: 0.6 }))!;
    expect(() => weighUnit(unit, weighing, [2], 0).next()).toThrow(/store 2: not in unit vellmoor/);
  });
});
