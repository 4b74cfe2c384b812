import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { centralHours } from '../../../../src/core/dispatch/hours.js';
import { hoursInput } from '../../../../src/core/dispatch/unitHours.js';
import { setTubeTemperatures, type TubeState } from '../../../../src/core/track/tube.js';
import { startUnit } from '../../../../src/core/unit.js';
import { unitModel } from '../../../../src/core/unitModel.js';
import type { UnitState } from '../../../../src/core/unitState.js';
import { drawnOut, movedTo } from '../../../../src/core/watch/healthyRollout.js';
import type { IndicatorInput, IndicatorView } from '../../../../src/core/watch/indicator.js';
import { ENERGY_LOST } from '../../../../src/core/watch/indicators/energyLost.js';
import { INDICATORS_DEFAULT } from '../../../../src/core/watch/rules.js';
import { unitOf } from '../../track/plants.js';
import { unsound } from './filter.js';

const mean = (cells: Float64Array): number => cells.reduce((sum, h) => sum + h, 0) / cells.length;
/** Smooth step from 1 to 0 about a place, over cells. */
const front = (n: number, place: number, width: number): Float64Array =>
  Float64Array.from({ length: n }, (_, i) => 1 / (1 + Math.exp((i - place) / width)));

describe('a profile moved along the bed', () => {
  it('has the mean asked for and the same extremes, whichever way it falls', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 8, max: 32, noNaN: true }),
        fc.double({ min: 0.3, max: 3, noNaN: true }),
        fc.double({ min: 0.1, max: 0.9, noNaN: true }),
        fc.boolean(),
        (place, width, wanted, turned) => {
          const cells = front(40, place, width);
          const profile = turned ? cells.map((h) => 1 - h) : cells;
          const moved = movedTo(profile, wanted)!;
          expect(mean(moved)).toBeCloseTo(wanted, 9);
          expect(Math.max(...moved)).toBeLessThanOrEqual(Math.max(...profile) + 1e-12);
          expect(Math.min(...moved)).toBeGreaterThanOrEqual(Math.min(...profile) - 1e-12);
        },
      ),
      { seed: 2, numRuns: 200 },
    );
  });

  it('is none where no place of it gives that mean', () => {
    expect(movedTo(front(40, 20, 1), 1.5)).toBeNull();
    expect(movedTo(front(40, 20, 1), -0.1)).toBeNull();
  });

  it('drawn out is as steep as the factor says', () => {
    const profile = front(400, 200, 20);
    const slope = (cells: Float64Array) => cells[199]! - cells[201]!;
    expect(slope(drawnOut(profile, 1.25, 200)) / slope(profile)).toBeCloseTo(1 / 1.25, 3);
  });
});

/** A small unit, both stores charged to `place` of their length with fronts of a width; twins of another. */
function unitAt(place: number, width_m: number, twinWidth_m: number) {
  const unit = unitOf();
  const model = unitModel(unit);
  const state = startUnit(unit) as UnitState;
  model.stores.forEach((store, s) => {
    const { kind, reference_hot_K: hot, reference_cold_K: cold, bed } = store.store;
    const [charged, discharged] = kind === 'hot' ? [hot, cold] : [cold, hot];
    const own = state.stores[s]!;
    const cells = store.tubes[0]!.layout.cells;
    const profile = (width: number) =>
      front(cells, place * cells, (0.6 * width * cells) / bed.length_m).map(
        (share) => discharged + share * (charged - discharged),
      );
    const set = (width: number) =>
      store.tubes.forEach((tube, k) => {
        setTubeTemperatures(tube, own.tubes[k] as TubeState, profile(width));
      });
    set(twinWidth_m);
    (state.views[s]!.twin as { enthalpy: Float64Array }).enthalpy = own.tubes[0]!.enthalpy.slice();
    set(width_m);
    own.started = true;
  });
  return { unit, model, state };
}

/** Charges that each end in that state; the view after each, and whether the last was worth two rollouts. */
function charges(count: number, width_m: number, twinWidth_m: number): IndicatorView[] {
  const { unit, model, state } = unitAt(0.6, width_m, twinWidth_m);
  const held = ENERGY_LOST.start(model);
  const power = unit.rated_power_W;
  const value = centralHours(hoursInput(model, state, power), power).hours / unit.rated_hours;
  const views: IndicatorView[] = [];
  for (let n = 0; n < count; n++)
    for (const mode of ['charge', 'discharge'] as const) {
      const time_ms = 1e12 + 36e5 * (12 * n + (mode === 'charge' ? 0 : 6));
      state.charge = { value, time_ms, least: 0.6, step: 0, given: 0, seen_ms: time_ms };
      const spread = { hot: { ratio: 1, sigma: 0.02 }, cold: { ratio: 1, sigma: 0.02 } };
      const input = { unit, model, state, spread, time_ms, taken: { conditions: { mode } } };
      const scan = input as unknown as IndicatorInput;
      const rule = INDICATORS_DEFAULT.rules.energy_lost;
      const [view] = ENERGY_LOST.step(held, rule, INDICATORS_DEFAULT, scan);
      if (mode === 'discharge') views.push(view!);
    }
  return views;
}

describe('dispatchable energy lost to degradation', () => {
  it('is none where the beds are as the twins', () => {
    const views = charges(3, 0.3, 0.3);
    expect(Math.abs(views.at(-1)!.value!)).toBeLessThan(0.01);
    expect(views.map((v) => v.state)).toEqual(['undetermined', 'normal', 'normal']);
    expect(views.flatMap(unsound)).toEqual([]);
  });

  it('is what wider fronts of the same heat cost, and is found after charges of them', () => {
    const views = charges(3, 0.9, 0.3);
    const last = views.at(-1)!;
    expect(last.value).toBeGreaterThan(0.1);
    expect(last.sigma).toBeLessThan(0.1 * last.value!);
    expect(last).toMatchObject({ state: 'degraded', subject: 'u', unit: '-' });
    expect(last.sentence).toMatch(
      /^Unit u: degraded beds cost 0\.\d\d \+\/- 0\.\d\d MWh_el at rated power/,
    );
    // Lost since the first charge: told against beds as configured, not against the worst of them.
    expect(last.sentence).toContain(
      `${(100 * last.value!).toFixed(1)} % of the rated energy (as conf`,
    );
    expect(views.flatMap(unsound)).toEqual([]);
  });

  it('is worth nothing without a twin, and not looked at where no rollout was due', () => {
    const { unit, model, state } = unitAt(0.6, 0.3, 0.3);
    const step = (time_ms: number) =>
      ENERGY_LOST.step(
        ENERGY_LOST.start(model),
        INDICATORS_DEFAULT.rules.energy_lost,
        INDICATORS_DEFAULT,
        {
          ...{ unit, model, state, spread: {}, time_ms },
          taken: { conditions: { mode: 'charge' } },
        } as unknown as IndicatorInput,
      )[0]!;
    state.charge = { value: 0.5, time_ms: 1e12, least: 0.6, step: 0, given: 0, seen_ms: 1e12 };
    expect(step(1e12 + 6e4)).toMatchObject({ value: null, reason: 'not_exercised' });
    expect(step(1e12).value).not.toBeNull();
    (state.views[0]!.twin as { lost: boolean }).lost = true;
    expect(step(1e12).value).toBeNull();
  });
});
