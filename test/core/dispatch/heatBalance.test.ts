import { describe, expect, it } from 'vitest';
import {
  type BalanceStep,
  type HeatBalance,
  sharedSigma,
  startHeatBalance,
  stepHeatBalance,
  varianceNow,
} from '../../../src/core/dispatch/heatBalance.js';
import {
  referenceEnthalpies,
  type StoreEnergy,
  storeEnergy,
} from '../../../src/core/track/storeEnergy.js';
import { type StoreState, startStore } from '../../../src/core/track/storeTracker.js';
import { setTubeTemperatures, type TubeState } from '../../../src/core/track/tube.js';
import { resetWall } from '../../../src/core/track/wallZone.js';
import { unitModel } from '../../../src/core/unitModel.js';
import { demoUnit } from '../../support/truthRun.js';

const unit = demoUnit();
const models = unitModel(unit).stores;
const FLOW = 15;
const DT_S = 60;

/** What a run was like: the bed takes `factor` times what the meter says the gas has brought. */
interface Run {
  readonly factor: number;
  readonly scans: number;
  readonly sigma?: (scan: number) => number;
  /** Of the sigma, from flow that no string sees. */
  readonly unseen?: number;
  /** Changes the store's state before a scan. */
  readonly before?: (state: StoreState, scan: number) => void;
  /** Above ambient, all of bed, wall and ends [K]. */
  readonly warmer_K?: number;
}

/** The balance of store `s` after a charge at constant flow whose outlet stays at the bed's temperature. */
function afterCharge(s: number, run: Run): HeatBalance {
  const model = models[s];
  if (model === undefined) throw new Error(`no store ${s}`);
  const state = startStore(model);
  const ambient_K = 283;
  const bed_K = ambient_K + (run.warmer_K ?? 0);
  model.tubes.forEach((tube, k) => {
    const own = state.tubes[k] as TubeState;
    setTubeTemperatures(tube, own, new Float64Array(tube.layout.cells).fill(bed_K));
    own.outlet_K = bed_K;
  });
  if (model.wall !== null && state.wall !== null) {
    resetWall(model.tables, state.wall, state.tubes[model.wall.tube] as TubeState);
    state.wall.outlet_K.fill(bed_K);
  }
  const inlet_K = model.store.kind === 'hot' ? 720 : 150;
  const { bed } = model.store;
  const { charged, discharged } = referenceEnthalpies(model);
  const full_J = (charged - discharged) * bed.area_m2 * bed.length_m;
  const cp = bed.fluid.heatCapacity((inlet_K + bed_K) / 2);
  const perScan = (run.factor * FLOW * cp * (inlet_K - bed_K) * DT_S) / full_J;
  const balance = startHeatBalance();
  const like: StoreEnergy = storeEnergy(model, state);
  for (let n = 0; n <= run.scans; n++) {
    const soc_sigma = run.sigma?.(n) ?? 0.003;
    const energy = { ...like, soc: 0.1 + n * perScan, soc_sigma, unseen: run.unseen ?? 0 };
    run.before?.(state, n);
    stepHeatBalance(model, state, balance, energy, {
      direction: 'charge',
      flow_kg_s: FLOW,
      inlet_K,
      ambient_K,
      dt_s: DT_S,
    });
  }
  return balance;
}

describe('the heat balance of a store', () => {
  it.each([0, 1])('finds what the bed takes per metered kilogram (store %d)', (s) => {
    for (const factor of [0.93, 1, 1.04]) {
      const { last } = afterCharge(s, { factor, scans: 300 });
      expect(last.charge?.log).toBeCloseTo(Math.log(factor), 9);
      expect(last.discharge).toBeNull();
    }
  });

  it('counts what was lost meanwhile as brought', () => {
    const kept = afterCharge(0, { factor: 1, scans: 300 }).last.charge?.log as number;
    const lost = afterCharge(0, { factor: 1, scans: 300, warmer_K: 100 }).last.charge
      ?.log as number;
    const { bed } = unit.stores[0] as (typeof unit.stores)[number];
    const watts =
      100 *
      bed.loss_factor *
      (bed.wall_loss_W_m2K * Math.PI * bed.diameter_m * bed.length_m +
        bed.area_m2 * (bed.end_loss_W_m2K.charge_inlet + bed.end_loss_W_m2K.discharge_inlet));
    const brought = FLOW * bed.fluid.heatCapacity((720 + 383) / 2) * (720 - 383);
    expect(lost - kept).toBeCloseTo(Math.log(1 + watts / brought), 9);
  });

  it('tells nothing before the state of charge has changed by 15 %', () => {
    expect(afterCharge(0, { factor: 1, scans: 30 }).last.charge).toBeNull();
  });

  it('is surer the longer the run, and begins anew where its start was badly known', () => {
    const short = afterCharge(0, { factor: 1, scans: 220 }).last.charge?.variance as number;
    const long = afterCharge(0, { factor: 1, scans: 400 }).last.charge?.variance as number;
    expect(long).toBeLessThan(short);
    // Known to 5 % at the start, to 0.3 % after ten scans: only those ten are given away.
    const late = afterCharge(0, { factor: 1, scans: 400, sigma: (n) => (n < 10 ? 0.05 : 0.003) });
    expect((late.last.charge?.variance as number) / long).toBeLessThan(1.1);
  });

  it('begins anew after standing or without a flow, and keeps what it found', () => {
    const balance = afterCharge(0, { factor: 1.02, scans: 300 });
    const model = models[0] as (typeof models)[number];
    const state = startStore(model);
    const found = balance.last.charge;
    stepHeatBalance(model, state, balance, storeEnergy(model, state), {
      direction: null,
      flow_kg_s: 0,
      inlet_K: Number.NaN,
      ambient_K: 283,
      dt_s: DT_S,
    });
    expect(balance.direction).toBeNull();
    expect(balance.metered).toBe(0);
    expect(balance.last.charge).toBe(found);
  });

  it('counts what no string sees to what all runs share, not to each', () => {
    const seen = afterCharge(0, { factor: 1, scans: 300, sigma: () => 0.004 }).last.charge;
    const sigma = () => Math.hypot(0.004, 0.01);
    const both = afterCharge(0, { factor: 1, scans: 300, sigma, unseen: 0.01 }).last.charge;
    expect(both?.variance).toBeCloseTo(seen?.variance as number, 12);
    // Three strings share the cross-section: each is off by 1 % of its front's way.
    const strings = (models[0] as (typeof models)[number]).tubes.map((t) => t.string.area_share);
    expect(sharedSigma(models[0] as (typeof models)[number])).toBeGreaterThan(
      0.01 * Math.hypot(...strings),
    );
  });

  it('does not count an error that lasts over the run', () => {
    // All that is uncertain is one offset, which every temperature follows: it is in both ends alike.
    const offset = (state: StoreState): void => {
      models[0]?.tubes.forEach((tube, k) => {
        const { cells, size, offset: at } = tube.layout;
        const p = (state.tubes[k] as TubeState).covariance.fill(0);
        for (let i = 0; i <= cells; i++) {
          for (let j = 0; j <= cells; j++) {
            p[(i < cells ? i : at) * size + (j < cells ? j : at)] = 0.5;
          }
        }
      });
    };
    const lasting = afterCharge(0, { factor: 1, scans: 300, before: offset }).last.charge;
    const passing = afterCharge(0, { factor: 1, scans: 300 }).last.charge;
    expect(passing?.variance).toBeGreaterThan(1e-5);
    expect((lasting?.variance as number) / (passing?.variance as number)).toBeLessThan(1e-6);
  });

  it('loses weight with time, standing or running the other way', () => {
    const balance = afterCharge(0, { factor: 1, scans: 300 });
    const model = models[0] as (typeof models)[number];
    const state = startStore(model);
    const found = balance.last.charge;
    if (found === null) throw new Error('nothing was found');
    const fresh = varianceNow(found);
    const standing = {
      direction: null,
      flow_kg_s: 0,
      inlet_K: Number.NaN,
      ambient_K: 283,
      dt_s: 3600,
    };
    for (let h = 0; h < 100; h++) {
      stepHeatBalance(model, state, balance, storeEnergy(model, state), standing);
    }
    // 0.1 % in an hour as a random walk: 1 % in a hundred.
    expect(varianceNow(found) - fresh).toBeCloseTo(0.01 ** 2, 9);
    expect(found.variance).toBe(fresh);
  });

  it('goes on from a state saved before ages and lasting errors were kept', () => {
    const saved = startHeatBalance();
    const {
      lasting: _,
      passing: __,
      share: ___,
      share_soc: ____,
      ...old
    } = { ...saved, direction: 'charge' as const };
    const kept = { log: 0.01, variance: 1e-4 };
    const balance = { ...old, last: { charge: kept, discharge: null } } as unknown as HeatBalance;
    const model = models[0] as (typeof models)[number];
    const state = startStore(model);
    const energy = storeEnergy(model, state);
    const step = { direction: 'charge', flow_kg_s: FLOW, inlet_K: 720, ambient_K: 283, dt_s: DT_S };
    stepHeatBalance(model, state, balance, energy, step as BalanceStep);
    expect(balance.passing).toBeGreaterThanOrEqual(0);
    expect(balance.lasting).toBeGreaterThanOrEqual(0);
    expect(varianceNow(kept)).toBeCloseTo(1e-4 + (1e-6 * DT_S) / 3600, 12);
  });
});
