import { calibrate } from '../../src/core/dispatch/calibration.js';
import {
  centralHours,
  computeHours,
  type HoursInput,
  MODEL_SIGMA,
} from '../../src/core/dispatch/hours.js';
import { hoursInput } from '../../src/core/dispatch/unitHours.js';
import { referenceEnthalpies, storeEnergy } from '../../src/core/track/storeEnergy.js';
import type { StoreModel, StoreState } from '../../src/core/track/storeTracker.js';
import { streamsOf } from '../../src/core/track/streams.js';
import { storeEnergyPosition, unseenSigma } from '../../src/core/track/unseenFlow.js';
import { restoreUnit, saveUnit, startUnit } from '../../src/core/unit.js';
import { unitModel } from '../../src/core/unitModel.js';
import { drawPlant } from '../../test/plant/draws.js';
import { withKnownMachine } from '../score/knownMachine.js';
import type { RowPlan, Scenario } from '../score/scenario.js';
import { unitWith } from '../score/sensorSets.js';
import { runSeries } from '../score/series.js';
import { truthOf } from '../score/truthOf.js';
import { truthGeometry } from '../score/truthPlant.js';
import { withTwins } from '../score/twins.js';
import { seenVariance } from './causes.js';
import { lnCapacity, trueCalibration } from './trueCalibration.js';
import { type ReadingError, withoutErrors } from './without.js';

/** One store at one time: errors (estimate less truth) and variances of the state of charge [-]. */
export interface StoreLook {
  readonly error: number;
  /** Of the tubes against the rock along the strings, and of what stands beside these rings. */
  readonly seen: number;
  readonly unseen: number;
  readonly sigma: number;
  readonly unseen_sigma: number;
  /** What of the unseen sigma is left where the fronts are taken to be even. */
  readonly unseen_wall: number;
  /** Way of the fronts since they were even, as a share of the bed. */
  readonly way: number;
  readonly by: Readonly<Record<string, number>>;
  /** ln of the heat capacity: estimate less truth, and sigma. */
  readonly capacity: number;
  readonly capacity_sigma: number;
  /** Stored heat over its sigma. */
  readonly stored: number;
}

/** Hours at one power: error [h] and its parts; sigma and its parts [h]. */
export interface HoursLook {
  readonly truth: number;
  readonly error: number;
  readonly sigma: number;
  /** With the true plant's calibration in place of the estimate's, what changes. */
  readonly by_calibration: number;
  readonly by_rock: readonly number[];
  readonly by_machine: number;
  /** State of charge of each store in error, times what that changes. */
  readonly by_charge: readonly number[];
  readonly sigma_calibration: number;
  readonly sigma_unseen: number;
  readonly sigma_model: number;
  readonly sigma_profile: number;
}

export interface Look {
  readonly seed: number;
  readonly at_h: number;
  readonly stores: Readonly<Record<string, StoreLook>>;
  readonly hours: HoursLook | null;
}

export const STORES = ['hot', 'cold'] as const;
const H = 3600;
const SETTLE_H = 1;
const QUANTILE_90 = 1.2815515655446004;

/** Runs a row over its recording and takes it apart at every time at which the truth knows hours. */
export function looksAt(
  scenario: Scenario,
  row: RowPlan,
  seed: number,
  hash: string,
  options: {
    readonly from_h: number;
    readonly every_h: number;
    readonly hours: boolean;
    readonly without: ReadonlySet<ReadingError>;
  },
): Look[] {
  const { from_h } = options;
  const recording = truthOf(scenario.truth, seed, hash);
  const { machine, period_s } = scenario.truth;
  const plain = unitWith(row.set, row.errors);
  const unit = machine === 'known' ? withKnownMachine(plain) : plain;
  const model = unitModel(unit);
  const geometry = truthGeometry(period_s);
  const draw = withTwins(
    drawPlant(geometry, seed, { physics: 'random', machine, sensors: 'class', meter: 'random' }),
  );
  const { hours, scans } = recording.header;
  const hourOf = (n: number) => ((n + 1) * recording.header.period_s) / H;
  const onTime = (n: number) => {
    const over = hourOf(n) % options.every_h;
    return Math.min(over, options.every_h - over) < 1e-6;
  };
  const wanted = hours.filter(
    (h) => hourOf(h.scan) >= from_h + SETTLE_H && h.scan + 1 < scans && onTime(h.scan),
  );
  const scan = Math.round((from_h * H) / recording.header.period_s);
  const series = runSeries(unit, recording, {
    errors: row.errors,
    hours: options.hours,
    through: withoutErrors(unit, draw, row.errors, recording.header.period_s, options.without),
    from: { scan, snapshot: saveUnit(startUnit(unit)) },
    keep: wanted.map((h) => h.scan + 1),
  });
  return wanted.map((h): Look => {
    const n = h.scan;
    const state = restoreUnit(unit, series.snapshots.get(n + 1)!);
    const capacities = calibrate(model, state, 1).capacity;
    const errors: number[] = [];
    const stores = model.stores.map((store, s): [string, StoreLook] => {
      const { id } = store.store;
      const own = state.stores[s]!;
      const found = storeEnergy(store, own);
      const truth = (name: string) => recording.truth(`${id}.${name}`, n);
      const at = truth(unit.stores[0]!.strings.length > 1 ? 'seen_all' : 'seen_one');
      errors.push(found.soc - truth('soc'));
      const tubes = chargeOfTubes(store, own);
      const x = storeEnergyPosition(store, own);
      const heat = series.stores[id]!;
      return [
        id,
        {
          error: found.soc - truth('soc'),
          seen: tubes - at,
          unseen: found.soc - tubes - (truth('soc') - at),
          sigma: found.soc_sigma,
          unseen_sigma: found.unseen,
          unseen_wall: unseenSigma(store, { ...own, origin_m: x }),
          way: (x - own.origin_m) / store.store.bed.length_m,
          by: seenVariance(store, own),
          capacity: capacities[s]!.log - lnCapacity(geometry, draw, id),
          capacity_sigma: capacities[s]!.sigma,
          stored: (heat.stored[n]! - truth('stored_MWh_th')) / heat.stored_sigma[n]!,
        },
      ];
    });
    const told = series.hours.find((c) => c.scan === n);
    const base = { seed, at_h: hourOf(n) - from_h, stores: Object.fromEntries(stores) };
    if (told === undefined || !(told.truth_h > 0)) return { ...base, hours: null };
    const input = hoursInput(model, state, h.power_W);
    const known = trueCalibration(model, geometry, draw, h.power_W, state.ambient_K);
    return {
      ...base,
      hours: hoursLook(input, h.power_W, known, errors, {
        truth: told.truth_h,
        error: told.p50 - told.truth_h,
        sigma: (told.p10 - told.p90) / (2 * QUANTILE_90),
      }),
    };
  });
}

function hoursLook(
  input: HoursInput,
  power_W: number,
  known: readonly number[],
  errors: readonly number[],
  told: Pick<HoursLook, 'truth' | 'error' | 'sigma'>,
): HoursLook {
  const { mean, covariance } = input.calibration!;
  const stores = input.models.length;
  const at = (own: HoursInput) => centralHours(own, power_W).hours;
  const now = at(input);
  // The meter moves travel and work alike: its estimate is taken out of both, so that rock and machine
  // can be put right one at a time.
  const hoursWith = (values: readonly number[]) =>
    at({ ...input, calibration: { mean: Float64Array.from(values), covariance } });
  const meter = mean[stores]! - known[stores]!;
  const level = Array.from(mean, (v) => v - meter);
  const by_rock = input.models.map((_, s) => {
    const right = level.map((v, i) => (i === s ? known[s]! : v));
    return now - hoursWith(right);
  });
  const by_calibration = now - hoursWith(known);
  const by_charge = input.models.map((model, s) => {
    const moved = shifted(model, input.states[s]!);
    const states = input.states.map((own, i) => (i === s ? moved : own));
    const change = storeEnergy(model, moved).soc - storeEnergy(model, input.states[s]!).soc;
    return Math.abs(change) < 1e-4 ? 0 : ((at({ ...input, states }) - now) / change) * errors[s]!;
  });
  const spread = (own: HoursInput) => {
    const { p10, p90 } = computeHours(own, power_W).hours;
    return ((p10 - p90) / (2 * QUANTILE_90)) ** 2;
  };
  const none = { mean, covariance: covariance.map((r) => new Float64Array(r.length)) };
  const all = spread(input);
  const exact = spread({ ...input, calibration: none });
  const even = input.states.map((own, s) => ({
    ...own,
    origin_m: storeEnergyPosition(input.models[s]!, own),
  }));
  const seen = spread({ ...input, calibration: none, states: even });
  const model = (MODEL_SIGMA * told.truth) ** 2;
  const root = (v: number) => Math.sqrt(Math.max(0, v));
  return {
    ...told,
    by_calibration,
    by_rock,
    by_machine: by_calibration - by_rock.reduce((a, b) => a + b, 0),
    by_charge,
    sigma_calibration: root(all - exact),
    sigma_unseen: root(exact - seen),
    sigma_model: Math.sqrt(model),
    sigma_profile: root(seen - model),
  };
}

/** State of charge as if all rock were as at the strings. */
function chargeOfTubes(model: StoreModel, state: StoreState): number {
  const { charged, discharged } = referenceEnthalpies(model);
  return model.tubes.reduce((sum, { string }, k) => {
    const { enthalpy } = state.tubes[k]!;
    const mean = enthalpy.reduce((a, h) => a + h, 0) / enthalpy.length;
    return sum + (string.area_share * (mean - discharged)) / (charged - discharged);
  }, 0);
}

/** A store's state with its profile moved by a cell towards the charge inlet. */
function shifted(model: StoreModel, state: StoreState): StoreState {
  const copy = structuredClone(state);
  for (const { enthalpy } of streamsOf(model, copy)) {
    enthalpy.copyWithin(0, 1);
  }
  return copy;
}
