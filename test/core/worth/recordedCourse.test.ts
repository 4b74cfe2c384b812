import { describe, expect, it } from 'vitest';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import { advance, startUnit } from '../../../src/core/unit.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { courseOf, recordCourse, takeScan } from '../../../src/core/worth/recordedCourse.js';
import { weighSensors } from '../../../src/core/worth/sensorWorth.js';
import { DEMO_GEOMETRY } from '../../plant/demoGeometry.js';
import { createTruth } from '../../plant/truth.js';
import { demoUnit, H } from '../../support/truthRun.js';
import { unitScan } from '../../support/unitScans.js';

const PERIOD_S = 60;
const plain = demoUnit();
const unit: UnitDefinition = { ...plain, estimator: { ...plain.estimator, cells: 40 } };

describe('a course from a recording of the finer plant', () => {
  const plant = createTruth({
    seed: 3,
    geometry: { ...DEMO_GEOMETRY, scan_period_s: PERIOD_S },
    resolution: { cells: 60, shells: 1 },
    initial: { hot: { front_m: 4, width_m: 0.6 }, cold: { front_m: 4, width_m: 0.6 } },
  });
  const P = DEMO_GEOMETRY.rated_power_W;
  const { scans } = plant.run([
    { mode: 'charge', power_W: 1.5 * P, duration_s: 2 * H },
    { mode: 'stand', duration_s: 1 * H },
    { mode: 'discharge', power_W: P, duration_s: 2 * H },
  ]);
  // Open from its first hour on: rejected at the end.
  const lost = 'hot_rim_07';
  const recorded = scans.map((scan, n) => {
    if (n < 60) return unitScan(unit, scan);
    return unitScan(unit, { ...scan, readings: { ...scan.readings, [lost]: Number.NaN } });
  });
  const recorder = recordCourse(unit);
  const state = startUnit(unit);
  const sigmas: number[] = [];
  for (const scan of recorded) {
    takeScan(recorder, scan);
    const { estimate } = advance(unit, state, scan, { hours_at_W: [], profile: false });
    sigmas.push(estimate.stores.hot!.soc_sigma);
  }
  const { course, rejected, covered_s } = courseOf(recorder)!;

  it('covers all scans but the first, in steps of five minutes that stop where the mode changes', () => {
    expect(covered_s).toBe((scans.length - 1) * PERIOD_S);
    expect(course.steps.reduce((sum, s) => sum + s.scans, 0)).toBe(scans.length - 1);
    const times = course.steps.map((s) => s.drives[0]!.dt_s);
    expect(Math.max(...times)).toBe(300);
    expect(new Set(course.steps.map((s) => s.mode))).toEqual(
      new Set(['charge', 'stand', 'discharge']),
    );
    const flux = (mode: string) =>
      course.steps.filter((s) => s.mode === mode).map((s) => s.drives[1]!.massFlux_kg_m2s);
    expect(Math.min(...flux('charge'))).toBeGreaterThan(0);
    expect(Math.max(...flux('discharge'))).toBeLessThan(0);
    expect(new Set(flux('stand').slice(1))).toEqual(new Set([0]));
  });

  it('keeps what a leak would carry in while it stands: gas at both ends, between its readings', () => {
    const stood = course.steps.filter((s) => s.drives.every((d) => d.massFlux_kg_m2s === 0));
    expect(stood.length).toBeGreaterThan(5);
    for (const [s, store] of unit.stores.entries()) {
      for (const end of ['charge_inlet', 'discharge_inlet'] as const) {
        const at = unitModel(unit).map.gas[store.id]![end];
        const read = recorded.map((scan) => scan.values[at]!);
        for (const step of stood) {
          const gas_K = step.drives[s]!.standing_K![end];
          expect(gas_K).toBeGreaterThanOrEqual(Math.min(...read));
          expect(gas_K).toBeLessThanOrEqual(Math.max(...read));
        }
      }
    }
  });

  it('follows the means of the estimator', () => {
    const last = course.steps.at(-1)!;
    expect(last.means![0]![2]!.enthalpy).toEqual(state.stores[0]!.tubes[2]!.enthalpy);
    expect(last.means![1]![0]!.further).toEqual(state.stores[1]!.tubes[0]!.further);
    expect(state.stores[0]!.wall).not.toBeNull();
    expect(last.walls).toEqual(state.stores.map((store) => store.wall));
    expect(last.known_s).toEqual(state.stores.map((store) => store.known_s));
    expect(course.steps[0]!.walls).not.toEqual(last.walls);
  });

  it('counts what is rejected at its end as out of use, and says what its repair would do', () => {
    expect(rejected.map((r) => [r.id, r.verdict])).toEqual([[lost, 'open']]);
    const out_of_use = new Set([lost]);
    const run = weighSensors(unitModel(unit).stores[0]!, 0, course, { places: 0, out_of_use });
    let next = run.next();
    while (!next.done) next = run.next();
    const { all, sensors } = next.value;
    expect(sensors.find((s) => s.id === lost)).toMatchObject({ in_use: false });
    expect(sensors.find((s) => s.id === lost)!.rise).toBeLessThan(0);
    // The sigma published over the second half. Readings of five scans at once, and another start,
    // leave a few percent.
    const half = sigmas.slice(Math.round(sigmas.length / 2));
    const published = Math.sqrt(half.reduce((sum, s) => sum + s * s, 0) / half.length);
    expect(all.soc_sigma_rms / published).toBeGreaterThan(0.93);
    expect(all.soc_sigma_rms / published).toBeLessThan(1.07);
  });

  it('is none where less than four hours are covered', () => {
    const short = recordCourse(unit);
    for (const scan of recorded.slice(0, 200)) takeScan(short, scan);
    expect(courseOf(short)).toBeNull();
    expect(courseOf(recordCourse(unit))).toBeNull();
  });
});
