import type { Direction, StoreEnd } from '../../definitions.js';
import { storeOutlets } from '../../track/drive.js';
import type { StoreModel } from '../../track/storeTracker.js';
import type { UnitState } from '../../unitState.js';
import { type BaselineState, learnBaseline, startBaseline } from '../baseline.js';
import type { Healthy } from '../follow.js';
import type {
  Indicator,
  IndicatorInput,
  IndicatorReason,
  IndicatorRule,
  IndicatorsDefinition,
  IndicatorView,
} from '../indicator.js';
import { decisionAt } from '../sequential.js';
import {
  type Followed,
  fixed,
  remembered,
  shownAs,
  stampOf,
  startFollowed,
  withSigma,
} from './shown.js';
import { beginAnew, healthyBy, testSide } from './sides.js';

/** Steel of pipes and plenum is warmed through after so long of a run [s]. */
const SETTLE_S = 2700;
/** Looked at so often; so many of these make one value [s]. */
const LOOK_S = 600;
const LOOKS = 6;
/**
 * One sigma of a value [K]: how the machine's losses change with load and ambient beyond what its model
 * has; a thermocouple's noise is far less.
 */
const VALUE_K = 1.5;
const RULE = { floor: 1, enough: 1.2, least: 4 };
/** Of a sound machine against its model as long as nothing is learned: points of efficiency [K]. */
const PRIOR_K = 6;
const HEALTHY = { configured: { value: 0, sigma: PRIOR_K }, baseline: RULE };
/** Tests that a value goes into: it may be off to either side. The two directions share no value. */
const SIDES = 2;

const DIRECTIONS = ['charge', 'discharge'] as const;

interface Plateau {
  /** Evidence of gas that is too hot, and too cold. */
  readonly above: Followed;
  readonly below: Followed;
  readonly healthy: BaselineState;
  looks: number;
  sum_K: number;
}

interface StorePlateaus {
  readonly charge: Plateau;
  readonly discharge: Plateau;
}

export interface PlateauState {
  /** Of the present run: direction, time, and since the last look [s]. */
  direction: Direction | null;
  ran_s: number;
  since_s: number;
  readonly stores: StorePlateaus[];
}

/**
 * Gas that enters each store against what the machine's model delivers with the gas that leaves the
 * other one, an hour of a run at a time. What the two usually differ by is learned for either
 * direction. Gas that comes too cool to a hot store means less heat at each kilogram: a machine, a
 * cooler or a pressure that is not what it was.
 */
export const PLATEAU: Indicator<PlateauState> = {
  kind: 'plateau',
  start: (model) => ({
    direction: null,
    ran_s: 0,
    since_s: 0,
    stores: model.stores.map(() => ({ charge: startPlateau(), discharge: startPlateau() })),
  }),
  step(state, rule, watching, input) {
    for (const { charge, discharge } of state.stores) {
      for (const one of [charge, discharge]) {
        const tests = [one.above.test, one.below.test];
        if (beginAnew([one.healthy], tests, watching.baseline_from_ms))
          Object.assign(one, { above: startFollowed(), below: startFollowed() });
      }
    }
    if (runs(state, input)) look(state, rule, watching, input);
    return input.model.stores.map((store, s) => {
      const plateaus = state.stores[s] as StorePlateaus;
      const { charge, discharge } = plateaus;
      const stamp = `${stampOf(charge.above)} ${stampOf(discharge.above)} ${rule.limit}`;
      return remembered(plateaus, stamp, () => view(plateaus, store, input, rule));
    });
  },
};

function startPlateau(): Plateau {
  return {
    above: startFollowed(),
    below: startFollowed(),
    healthy: startBaseline(),
    looks: 0,
    sum_K: 0,
  };
}

/** Whether the run is to be looked at in this scan. */
function runs(state: PlateauState, { taken, dt_s }: IndicatorInput): boolean {
  const { mode, flow_kg_s, flowKnown } = taken.conditions;
  const direction = mode !== 'stand' && flow_kg_s !== 0 && flowKnown ? mode : null;
  if (direction !== state.direction) {
    state.direction = direction;
    state.ran_s = 0;
    state.since_s = 0;
    for (const store of state.stores) {
      for (const one of DIRECTIONS) Object.assign(store[one], { looks: 0, sum_K: 0 });
    }
  }
  if (direction === null) return false;
  state.ran_s += dt_s;
  if (state.ran_s < SETTLE_S) return false;
  state.since_s += dt_s;
  if (state.since_s < LOOK_S) return false;
  state.since_s = 0;
  return true;
}

const endOf = (direction: Direction): StoreEnd =>
  direction === 'charge' ? 'charge_inlet' : 'discharge_inlet';

function look(
  state: PlateauState,
  rule: IndicatorRule,
  watching: IndicatorsDefinition,
  { model, state: unit, taken, time_ms }: IndicatorInput,
): void {
  const direction = state.direction as Direction;
  const { scan, conditions } = taken;
  const outlets = storeOutlets(model, unit as UnitState, scan)[direction];
  const point = model.machine.operate(direction, outlets, conditions.ambient_K);
  model.stores.forEach(({ store }, s) => {
    const channel = model.map.gas[store.id]?.[endOf(direction)] ?? -1;
    const read = channel >= 0 ? (scan.values[channel] as number) : Number.NaN;
    const expected =
      store.kind === 'hot' ? point.inlets.hot_K : (point.inlets.cold_K ?? Number.NaN);
    const off = read - expected;
    if (!Number.isFinite(off)) return;
    const plateau = (state.stores[s] as StorePlateaus)[direction];
    plateau.looks++;
    plateau.sum_K += off;
    if (plateau.looks < LOOKS) return;
    take(plateau, plateau.sum_K / plateau.looks, rule, watching, time_ms);
    plateau.looks = 0;
    plateau.sum_K = 0;
  });
}

function take(
  plateau: Plateau,
  off_K: number,
  rule: IndicatorRule,
  { in_control_d, baseline_from_ms }: IndicatorsDefinition,
  time_ms: number,
): void {
  const known = healthyBy(plateau.healthy, HEALTHY);
  const value = off_K - known.value;
  for (const [followed, sign] of [
    [plateau.above, 1],
    [plateau.below, -1],
  ] as const) {
    followed.decision = decisionAt(in_control_d, LOOKS * LOOK_S, SIDES);
    const limit = { degraded: sign * rule.limit, back: sign * (rule.limit - rule.deadband) };
    testSide(followed.test, { value: off_K, sigma: VALUE_K }, known, limit, followed.decision);
    Object.assign(followed, { value, sigma: Math.hypot(VALUE_K, known.sigma), time_ms });
  }
  const { above, below } = plateau;
  const leans = [above, below].some(
    ({ test, decision }) => test.degraded || test.up > 0.25 * decision,
  );
  if (leans) return;
  const own = { value: off_K, sigma: VALUE_K };
  learnBaseline(plateau.healthy, own, time_ms, baseline_from_ms, RULE);
}

function view(
  plateaus: StorePlateaus,
  { store }: StoreModel,
  { model }: IndicatorInput,
  rule: IndicatorRule,
): IndicatorView {
  const measured = DIRECTIONS.filter((d) => (model.map.gas[store.id]?.[endOf(d)] ?? -1) >= 0);
  // The direction and side that is furthest on; else the newest.
  const all = DIRECTIONS.flatMap((direction) =>
    [plateaus[direction].above, plateaus[direction].below].map((followed) => ({
      direction,
      followed,
    })),
  );
  const worst = all.reduce((a, b) => (rank(b.followed, a.followed) > 0 ? b : a));
  const plateau = plateaus[worst.direction];
  const known = healthyBy(plateau.healthy, HEALTHY);
  const { followed } = worst;
  let reason: IndicatorReason | null = null;
  if (measured.length === 0) reason = 'not_instrumented';
  else if (followed.test.count === 0) reason = null;
  else if (!plateau.healthy.kept) reason = 'learning';
  else if (isOffAlways(known, rule)) reason = 'too_uncertain';
  return shownAs({
    kind: 'plateau',
    subject: store.id,
    unit: 'K',
    rule,
    followed,
    healthy: measured.length === 0 ? null : 0,
    healthy_from: known.from,
    reason,
    sentence: sentence(store.id, worst.direction, followed, known, measured.length === 0, rule),
  });
}

/** What is usual is itself beyond the limit, so that being as usual is not yet being sound. */
const isOffAlways = ({ value }: Healthy, { limit }: IndicatorRule): boolean =>
  Math.abs(value) > limit;

function rank(a: Followed, b: Followed): number {
  return (
    Number(a.test.degraded) - Number(b.test.degraded) ||
    a.test.up - b.test.up ||
    (a.time_ms ?? 0) - (b.time_ms ?? 0)
  );
}

function sentence(
  store: string,
  direction: Direction,
  { value, sigma, test }: Followed,
  known: Healthy,
  blind: boolean,
  rule: IndicatorRule,
): string {
  if (blind)
    return `Store ${store}: the gas that enters it is not measured, so the machine's delivery is not known.`;
  const while_ = direction === 'charge' ? 'charging' : 'discharging';
  if (value === null || sigma === null)
    return `Store ${store}: what the machine delivers to it shows after two hours of a run.`;
  const off = `${fixed(known.value, 1)} K off`;
  const usual =
    known.from === 'learned'
      ? `than usual against the machine's model (usually ${off} it)`
      : known.value === 0
        ? "than the machine's model has it"
        : `than the machine's model has it, taken as ${off}, the most that is believed to be sound`;
  const figure = `${withSigma(Math.abs(value), sigma, 1)} K ${value > 0 ? 'hotter' : 'colder'} ${usual}, limit ${rule.limit} K`;
  const means = test.degraded ? ' Machine, coolers or pressures are not what they were.' : '';
  const always =
    isOffAlways(known, rule) && !test.degraded
      ? ` It has been ${off} the model from the start: more than the limit. Whether that is machine, thermometer or model as configured is open.`
      : '';
  return `Store ${store}: while ${while_} gas enters it ${figure}.${means}${always}`;
}
