import type { UnitDefinition } from '../definitions.js';
import type { DispatchAnswer, EndCause, Quantiles } from '../estimate.js';
import type { Machine } from '../machine/machine.js';
import { referenceEnthalpies } from '../track/storeEnergy.js';
import type { StoreModel, StoreState } from '../track/storeTracker.js';
import type { TubeState } from '../track/tube.js';
import { unseenSigma } from '../track/unseenFlow.js';
import { earliestQuantiles } from './earliestQuantiles.js';
import { lackAtFirst, mayNotBegin, quantilesAtEnd, quantilesAtStart } from './edge.js';
import type { FirstLack } from './firstMinutes.js';
import type { Gaussian } from './gaussian.js';
import { addProfile } from './profileCovariance.js';
import { BUMP_K, BUMPS, createRoller, type Roller } from './roller.js';
import { type RolloutResult, RULES } from './rollout.js';

/** What hours are computed from. */
export interface HoursInput {
  readonly unit: UnitDefinition;
  readonly machine: Machine;
  readonly models: readonly StoreModel[];
  readonly states: readonly StoreState[];
  /** Gas temperature at each store's discharge outlet, NaN = as the bed's end [K]. */
  readonly plenum_K: readonly number[];
  /**
   * ln(mean flow factor) of each store and then ln(work factor), jointly (see `calibrate`); null =
   * the tubes' factors as they are, the machine as defined, both exact.
   */
  readonly calibration: Gaussian | null;
  readonly ambient_K: number;
}

const PROBE_LOG = 0.01;
/**
 * The rollout, off by 0.2 % from the true state of the finer plant (relative, rms over what is drawn
 * there, by tools/hours.ts).
 */
export const MODEL_SIGMA = 0.002;
const J_PER_MWH = 3.6e9;

/**
 * Hours that a unit can deliver a net power from now, with what ends it.
 *
 * The beds are rolled forward to the time tau_r at which each stop rule breaks, on cells of half the
 * length. The gradient of every tau_r with respect to the profiles (along overlapping bumps), the
 * flow and transfer factors and the machine's work comes from rollouts with common numbers; with
 * the filter's covariance P and that of the calibration it gives the covariance of the tau_r. The
 * hours are the minimum over the rules: its quantiles are taken over fixed quasi-random points of
 * that joint Gaussian, so they carry no sampling noise from call to call. p90 is exceeded with 90 %
 * probability. What is missing of the power in the first minutes is told (see `lackAtFirst`) and taken
 * from the energy. Where the central run does not begin, or is not over long after the time answered,
 * single plants stand for the quantiles: see `quantilesAtStart` and `quantilesAtEnd`.
 *
 * @throws RangeError for a power that is not above 0
 */
export function computeHours(input: HoursInput, power_W: number): DispatchAnswer {
  if (!(power_W > 0)) throw new RangeError(`power_W = ${power_W}: expected above 0`);
  const roller = createRoller(input, power_W);
  const best = roller.best();
  const lack = lackAtFirst(input, roller, best, power_W);
  const by = best.ends_by;
  if (!(best.end_s > 0)) return answer(power_W, quantilesAtStart(input, roller, best), by, lack);
  if (best.end_s > roller.known_to_s) {
    return answer(power_W, quantilesAtEnd(input, roller, best), by, lack);
  }
  const base = roller.roll();
  const fine = roller.rollFine();
  if (base.end_s === 0 || fine.end_s === 0) {
    return answer(power_W, quantilesAtStart(input, roller, best), by, lack);
  }
  // Rules that were not reached while rolling cannot bind; they are left out of the minimum.
  const live = RULES.map((_, r) => r).filter((r) =>
    [best, base, fine].every((result) => Number.isFinite(result.times_s[r] as number)),
  );
  if (live.length === 0) return answer(power_W, quantilesAtEnd(input, roller, best), by, lack);
  const covariance = live.map(() => new Float64Array(live.length));
  const slope = (times: Float64Array, delta: number, from = base): number[] =>
    live.map((r) => {
      const t = times[r] as number;
      return Number.isFinite(t) ? (t - (from.times_s[r] as number)) / delta : 0;
    });
  // Along ln(mean flow factor) of each store and ln(work factor), in the order of the calibration.
  const factors = input.models.map((model, s) => {
    const bumps = Array.from({ length: BUMPS }, (_, b) =>
      slope(roller.roll({ store: s, bump: b }).times_s, BUMP_K),
    );
    const flow = slope(roller.roll({ store: s, flow: PROBE_LOG }).times_s, PROBE_LOG);
    const better = roller.rollFine({ store: s, transfer: PROBE_LOG });
    const transfer = slope(better.times_s, PROBE_LOG, fine);
    addUnseen(input, s, perCharge(input, s, roller, live, base), covariance);
    const state = input.states[s] as StoreState;
    return addProfile(model, state, { bumps, flow, transfer }, covariance);
  });
  factors.push(slope(roller.roll({ work: PROBE_LOG }).times_s, PROBE_LOG));
  const mean = live.map((r) => best.times_s[r] as number);
  for (let a = 0; a < live.length; a++) {
    for (let b = 0; b < live.length; b++) {
      let sum = (mean[a] as number) * (mean[b] as number) * MODEL_SIGMA ** 2;
      input.calibration?.covariance.forEach((row, i) => {
        row.forEach((value, j) => {
          sum += (factors[i]?.[a] as number) * (factors[j]?.[b] as number) * value;
        });
      });
      (covariance[a] as Float64Array)[b]! += sum;
    }
  }
  const hours = earliestQuantiles(mean, covariance);
  const within = (h: number): number => Math.min(h, roller.most_s / 3600);
  const { p50, p10 } = hours;
  const p90 = mayNotBegin(input, roller, best, power_W) ? 0 : hours.p90;
  return answer(power_W, { p90: within(p90), p50: within(p50), p10: within(p10) }, by, lack);
}

/**
 * What flow that no string sees may do to the rules: the front stands elsewhere, by its sigma in state
 * of charge times what that changes.
 */
function addUnseen(
  input: HoursInput,
  s: number,
  slopes: readonly number[],
  covariance: readonly Float64Array[],
): void {
  const sigma = unseenSigma(input.models[s] as StoreModel, input.states[s] as StoreState);
  slopes.forEach((own, a) => {
    slopes.forEach((other, b) => {
      (covariance[a] as Float64Array)[b]! += sigma * sigma * own * other;
    });
  });
}

/** Of a store whose profile spans less than this share of its references there is no front to move. */
const FRONT_SPAN = 0.3;

/**
 * What the rules' times change with a store's state of charge where its front stands elsewhere
 * [s], by rule: from a rollout with the profile moved on by a cell. Where there is no front, a
 * store's own outlet and the flow last as long as its heat does: tau/soc.
 */
function perCharge(
  input: HoursInput,
  s: number,
  roller: Roller,
  live: readonly number[],
  base: RolloutResult,
): number[] {
  const model = input.models[s] as StoreModel;
  const { charged, discharged } = referenceEnthalpies(model);
  let soc = 0;
  let change = 0;
  let cells = 1;
  model.tubes.forEach((tube, k) => {
    const { enthalpy } = (input.states[s] as StoreState).tubes[k] as TubeState;
    const w = tube.string.area_share / (charged - discharged);
    cells = enthalpy.length;
    change += (w * ((enthalpy[0] as number) - (enthalpy[cells - 1] as number))) / cells;
    for (const h of enthalpy) soc += (w * (h - discharged)) / cells;
  });
  if (change * cells > FRONT_SPAN) {
    const { times_s } = roller.roll({ store: s, moved: true });
    return live.map((r) => {
      const t = times_s[r] as number;
      return Number.isFinite(t) ? (t - (base.times_s[r] as number)) / change : 0;
    });
  }
  const own = model.store.kind === 'hot' ? 'hot_outlet' : 'cold_outlet';
  return live.map((r) =>
    (RULES[r] === own || RULES[r] === 'flow') && soc > 0 ? (base.times_s[r] as number) / soc : 0,
  );
}

/** Only the central figure [s of discharge], for a state of charge between full answers. */
export function centralHours(
  input: HoursInput,
  power_W: number,
): { hours: number; ends_by: EndCause } {
  const roller = createRoller(input, power_W);
  const result = roller.end();
  return {
    hours: Math.min(result.end_s, roller.most_s) / 3600,
    ends_by: result.ends_by,
  };
}

function answer(
  power_W: number,
  hours: Quantiles,
  ends_by: EndCause,
  lack: FirstLack | null,
): DispatchAnswer {
  const power_MW = power_W / 1e6;
  const energy = (of: keyof Quantiles): number =>
    Math.max(0, hours[of] * 3600 * power_W - (lack?.missing_J[of] ?? 0)) / J_PER_MWH;
  return {
    power_MW,
    hours,
    energy_MWh_el: { p90: energy('p90'), p50: energy('p50'), p10: energy('p10') },
    ends_by,
    ...(lack === null ? {} : { first_minutes: lack.told }),
  };
}
