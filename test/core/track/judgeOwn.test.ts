import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { freshSensor } from '../../../src/core/track/judgeMemory.js';
import { ownFault, ownOf } from '../../../src/core/track/judgeOwn.js';
import { judgeWork, predictTubeReadings } from '../../../src/core/track/judgeWork.js';
import { startStore, stepStore } from '../../../src/core/track/storeTracker.js';
import { mulberry } from '../../support/random.js';
import { hotBed, hotStore, modelOf, stringOf } from './plants.js';
import { Bed } from './randomStore.js';

const SENSORS = 10;
const ODD = 4;

/** A store after some scans of charging, its front amid the string. */
function started() {
  const bedOf = hotBed({ wall_loss_W_m2K: 0 });
  const strings = [stringOf('s', SENSORS, 4, { radius_m: 0, area_share: 1, groups: ['card'] })];
  const model = modelOf(hotStore({ bed: bedOf, strings }));
  const state = startStore(model);
  const bed = new Bed(model, mulberry(3), 0.4);
  const drive = {
    ...{ massFlux_kg_m2s: 0.5, inlet_K: 733, inletSigma_K: 0, ambient_K: 283.15 },
    ...{ dt_s: 60, travelSigma_m: 0 },
  };
  for (let scan = 1; scan <= 30; scan++) {
    bed.step(drive);
    stepStore(model, state, scan === 1 ? null : drive, bed.readings(), scan * 60_000, 0);
  }
  const work = judgeWork(model);
  predictTubeReadings(model, state, work, 0);
  const { layout, estimator } = model.tubes[0]!;
  const set = (index: number, value: number) => {
    state.tubes[0]!.further[index - layout.cells] = value;
  };
  const own = (sensor: number, unseen_m = 0) =>
    ownOf(model, state, work, work.candidates[sensor]!, unseen_m);
  return { state, layout, estimator, set, own };
}

describe('what the filter had to take for a sensor’s own', () => {
  it('is within its class on a sound bed', () => {
    const { own } = started();
    for (let i = 0; i < SENSORS; i++) expect(own(i).sigmas).toBeLessThan(4);
  });

  it('counts against the others of its string: a profile that is off moves them all', () => {
    const { layout, estimator, set, own } = started();
    for (let i = 0; i < SENSORS; i++) set(layout.position + i, 40 * estimator.position_sigma_m);
    for (let i = 0; i < SENSORS; i++) expect(own(i).sigmas).toBeLessThan(4);
    set(layout.position + ODD, -40 * estimator.position_sigma_m);
    expect(own(ODD).place_m).toBeCloseTo(-80 * estimator.position_sigma_m, 9);
    // Of both ways to see it the milder; the lag of the gas is in the sigma.
    expect(own(ODD).sigmas).toBeLessThanOrEqual(40.1);
  });

  it('is less where the profile is not seen on the way to the next one', () => {
    const { layout, estimator, set, own } = started();
    set(layout.offset + ODD, 0);
    set(layout.position + ODD, 12 * estimator.position_sigma_m);
    const seen = own(ODD).sigmas;
    const unseen_m = 3 * estimator.position_sigma_m;
    // Squares of the place's own sigma and of what is not seen add up.
    const sigma_m = (12 * estimator.position_sigma_m) / seen;
    expect(own(ODD, unseen_m).sigmas).toBeCloseTo(
      (seen * sigma_m) / Math.hypot(sigma_m, unseen_m),
      9,
    );
    expect(own(ODD, unseen_m).sigmas).toBeLessThan(seen / 1.2);
  });

  it('grows with offset and place alone, whatever both are', () => {
    const { layout, set, own } = started();
    set(layout.offset + ODD, 0);
    fc.assert(
      fc.property(fc.double({ min: -40, max: 40, noNaN: true }), (offset) => {
        set(layout.offset + ODD, offset);
        const { offset_K, sigmas } = own(ODD);
        expect(offset_K).toBe(offset);
        // 1 K and 0.375 % of the temperature, which is at most 460 degC: two sigma of the class.
        expect(sigmas).toBeGreaterThanOrEqual(Math.abs(offset) / Math.hypot(1, 0.00375 * 462));
        return Number.isFinite(sigmas);
      }),
      { numRuns: 50 },
    );
  });
});

describe('a sensor whose own cannot be', () => {
  const own = { offset_K: 2.3, place_m: -0.133, sigmas: 11 };

  it('is named once it has lasted five minutes; as drifting where it had been sound before', () => {
    const memory = { ...freshSensor(), usualAge_s: 86_400, recent_K: 16 };
    for (let minute = 1; minute < 5; minute++)
      expect(ownFault(memory, { dt_s: 60, own })).toBeNull();
    const fault = ownFault(memory, { dt_s: 60, own });
    expect(fault).toMatchObject({ verdict: 'drifting', off_K: 16 });
    expect(fault!.evidence).toContain('an offset of 2.3 K and -133 mm from its place');
    const young = { ...freshSensor(), usualAge_s: 0, recent_K: 16 };
    expect(ownFault(young, { dt_s: 300, own })?.verdict).toBe('offset');
  });

  it('begins anew where it falls back, and where nothing is known of it', () => {
    const memory = { ...freshSensor(), usualAge_s: 86_400 };
    ownFault(memory, { dt_s: 240, own });
    expect(ownFault(memory, { dt_s: 60, own: { ...own, sigmas: 9.9 } })).toBeNull();
    expect(ownFault(memory, { dt_s: 240, own })).toBeNull();
    expect(ownFault(memory, { dt_s: 60 })).toBeNull();
    expect(ownFault(memory, { dt_s: 240, own: { ...own, sigmas: Number.NaN } })).toBeNull();
    expect(ownFault(memory, { dt_s: 299, own })).toBeNull();
  });
});
