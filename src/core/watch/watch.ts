import type { Mode, StoreDefinition, UnitDefinition } from '../definitions.js';
import type { Estimate, StoreEstimate } from '../estimate.js';
import type { GasDoubt } from '../track/gasDoubts.js';
import type { CauseView } from './causes.js';
import {
  type ConditionState,
  type ConditionTiming,
  type Evidence,
  evidenceOf,
  isIdle,
  startCondition,
  stepEvidence,
} from './condition.js';
import { hangsInGas, isConsequence, MAY_FOLLOW, mayBeMeter } from './consequences.js';
import type { EventKind, WatchEvent } from './event.js';
import type { IndicatorView } from './indicator.js';
import { INDICATORS_VERSION, type IndicatorStates } from './indicators.js';
import { type EventParts, INDICATOR_EVENTS, watchEvent } from './kinds.js';
import * as say from './messages.js';
import { type DropsSeen, watchBlind, watchDrops } from './operatorAlarms.js';
import { watchOutlets } from './outletAlarm.js';
import type { RunEndState } from './runEnd.js';

export interface WatchInput {
  /** Source time of the scan [ms]. */
  readonly time_ms: number;
  readonly mode: Mode;
  readonly estimate: Estimate;
  /** How many readings this scan brought, of any channel. */
  readonly readingsSeen: number;
  /** Measured pressure drop by store id [Pa], null: no reading now; absent: none is measured. */
  readonly drops_Pa?: Readonly<Record<string, number | null>>;
  /** What was told of the end of the discharge that runs, and what is expected; absent: nothing. */
  readonly run?: RunEndState | undefined;
  /** What is known of the gas-temperature channels; absent: nothing. */
  readonly gas?: readonly GasDoubt[];
  /** What the indicators show, and what is probably behind it; absent: nothing. */
  readonly indicators?: readonly IndicatorView[];
  readonly causes?: readonly CauseView[];
}

/** Plain and bounded: at most one entry per kind and subject of the unit. */
export interface WatchState {
  conditions: Record<string, ConditionState>;
  /** Source time of the last scan with a reading; of the first scan before there was one [ms]. */
  lastReading_ms: number | null;
  /** Of the discharge that runs; absent while there is none. */
  run?: RunEndState;
  /** When each store's pressure drop was last read; absent before. */
  drops?: DropsSeen;
  /** Absent in a state saved before there were any. */
  indicators?: IndicatorStates;
  /** INDICATORS_VERSION of that; states of another one are not taken over. */
  indicators_version?: number;
}

const AT_ONCE = { on_delay_s: 0, off_delay_s: 0 };
/** So many rejected sensors of one store are one event: this share of them, and at least so many. */
const MANY_SHARE = 0.2;
const MANY_LEAST = 4;
/** Within this time a charge and a discharge tell a flow meter from dust, where the plant cycles. */
const METER_WAIT_S = 86_400;
/** A delay starts afresh after this many scan periods without a scan. */
const GAP_SCANS = 5;

export function startWatch(): WatchState {
  return {
    conditions: {},
    lastReading_ms: null,
    indicators: {},
    indicators_version: INDICATORS_VERSION,
  };
}

/**
 * Holds one scan's estimate against the unit's limits and returns what was raised or returned now,
 * in the order of the stores.
 *
 * @param state changed in place
 * @throws RangeError for a time before the last one
 */
export function stepWatch(
  unit: UnitDefinition,
  state: WatchState,
  input: WatchInput,
): WatchEvent[] {
  const events: WatchEvent[] = [];
  const step: Step = (kind, subject, evidence, timing, value, limit, message) => {
    const key = `${kind}/${subject}`;
    const known = state.conditions[key];
    const condition = known ?? startCondition();
    // Only the delays: what has them may be a whole view.
    const { on_delay_s, off_delay_s } = timing;
    const transition = stepEvidence(condition, evidence, {
      time_ms: input.time_ms,
      gap_s: GAP_SCANS * unit.scan_period_s,
      on_delay_s,
      off_delay_s,
    });
    if (!isIdle(condition)) state.conditions[key] = condition;
    else if (known !== undefined) delete state.conditions[key];
    if (transition === null) return;
    const parts = { unit: unit.id, kind, subject, transition, time_ms: input.time_ms };
    const said = message(transition === 'raised');
    const told = typeof said === 'string' ? { message: said } : said;
    events.push(watchEvent({ ...parts, value, limit, ...told }));
  };

  watchAge(unit, state, input, step);
  watchBlind(unit, input.mode, input.estimate.quality, step);
  watchDrops(unit, state, input, step);
  for (const store of unit.stores) {
    const estimate = input.estimate.stores[store.id];
    if (estimate === undefined) continue;
    watchSensors(state, store, estimate, input.indicators ?? [], unit.watch.sensor_rejected, step);
  }
  watchOutlets(unit, input, step);
  watchGas(input, step);
  watchIndicators(state, input, step);
  return events;
}

export type Step = (
  kind: EventKind,
  subject: string,
  evidence: Evidence,
  delays: Pick<ConditionTiming, 'on_delay_s' | 'off_delay_s'>,
  value: number | null,
  limit: number | null,
  message: (raised: boolean) => string | Said,
) => void;

/** A sentence, and what the state makes of priority and time to act. */
export type Said = Pick<EventParts, 'message' | 'priority' | 'act_by_ms'>;

/** Age in source time, by scans without any reading. */
function watchAge(unit: UnitDefinition, state: WatchState, input: WatchInput, step: Step): void {
  if (input.readingsSeen > 0 || state.lastReading_ms === null) state.lastReading_ms = input.time_ms;
  const rule = unit.watch.data_age_s;
  const age = (input.time_ms - state.lastReading_ms) / 1000;
  step(
    'data_stale',
    unit.id,
    evidenceOf({ ...rule, value: age }),
    rule,
    age,
    rule.limit,
    (raised) => (raised ? say.staleRaised(unit.id, age, rule.limit) : say.staleReturned(unit.id)),
  );
}

interface SensorKey {
  readonly id: string;
  /** Of its condition. */
  readonly key: string;
}

const sensorKeys = new WeakMap<StoreDefinition, readonly SensorKey[]>();

/** The thermocouples of a store, made once: a text for each of them costs more than looking it up. */
function sensorsOf(store: StoreDefinition): readonly SensorKey[] {
  const known = sensorKeys.get(store);
  if (known !== undefined) return known;
  const made = store.strings.flatMap((string) =>
    string.thermocouples.map(({ id }) => ({ id, key: `sensor_rejected/${id}` })),
  );
  sensorKeys.set(store, made);
  return made;
}

/**
 * One event per sensor; but where many of a store are rejected at once there is one common cause, and
 * one event for the store instead of a flood (ISA-18.2): those not told of yet wait until it is over. Those
 * that hang in gas over a settled bed wait for its alert, and are withdrawn once it stands.
 */
function watchSensors(
  state: WatchState,
  store: StoreDefinition,
  estimate: StoreEstimate,
  views: readonly IndicatorView[],
  rule: UnitDefinition['watch']['sensor_rejected'],
  step: Step,
): void {
  const sensors = sensorsOf(store);
  const { rejected } = estimate.sensors;
  const many = Math.max(MANY_LEAST, MANY_SHARE * sensors.length);
  const flood = rejected.length >= many;
  const count = rejected.length;
  step('sensor_rejected', store.id, flood ? 'active' : 'clear', rule, count, many, (raised) =>
    raised
      ? say.manySensorsRaised(store.id, count, sensors.length)
      : say.manySensorsReturned(store.id, count, sensors.length),
  );
  for (const { id, key } of sensors) {
    const known = state.conditions[key];
    const sensor = rejected.find((one) => one.id === id);
    if (sensor === undefined && known === undefined) continue;
    const inGas = sensor !== undefined && hangsInGas(store, id, sensor.verdict, views);
    const waits = (flood || inGas) && !known?.raised;
    const isTold = inGas && (state.conditions[`bed_settled/${store.id}`]?.raised ?? false);
    const evidence =
      sensor === undefined || (isTold && !waits) ? 'clear' : waits ? 'unknown' : 'active';
    step('sensor_rejected', id, evidence, isTold ? AT_ONCE : rule, null, null, (raised) => {
      if (sensor === undefined) return say.sensorReturned(store.id, id);
      return raised ? say.sensorRaised(store.id, sensor) : say.sensorInGas(store.id, id);
    });
  }
}

/** Found after long flow and ended likewise, so that nothing is left to wait for. */
function watchGas({ gas = [] }: WatchInput, step: Step): void {
  for (const one of gas) {
    const evidence = one.doubtful ? 'active' : 'clear';
    step('gas_temperature_off', one.channel, evidence, AT_ONCE, one.off_K, one.limit_K, (raised) =>
      raised ? say.gasRaised(one) : say.gasReturned(one),
    );
  }
}

/**
 * What has been decided is active or clear; what is not known neither raises nor returns. What only
 * follows from a cause whose alert stands waits: it is looked at after those. Pressure drops that a meter
 * may be behind wait for what tells it, a day at most; one told before is withdrawn, as it named a bed.
 */
function watchIndicators(
  { conditions }: WatchState,
  { indicators = [], causes = [] }: WatchInput,
  step: Step,
): void {
  const stands = (view: IndicatorView): boolean =>
    view.state === 'degraded' || isRaised(conditions, view);
  const late = (view: IndicatorView): boolean => MAY_FOLLOW.has(view.kind);
  for (const view of [...indicators.filter((v) => !late(v)), ...indicators.filter(late)]) {
    const kind = INDICATOR_EVENTS[view.kind];
    if (kind === undefined) continue;
    const { subject, state, value, limit } = view;
    const isTold = isRaised(conditions, view);
    const isBad = state === 'degraded';
    const waits = isBad && !isTold && isConsequence(view, indicators, causes, stands);
    const isWithdrawn =
      isBad &&
      isTold &&
      view.kind === 'pressure_drop' &&
      isConsequence(view, indicators, causes, (other) => isRaised(conditions, other));
    const evidence =
      waits || state === 'undetermined' ? 'unknown' : isBad && !isWithdrawn ? 'active' : 'clear';
    const delays = isWithdrawn
      ? AT_ONCE
      : mayBeMeter(view, indicators)
        ? { ...view, on_delay_s: METER_WAIT_S }
        : view;
    step(kind, subject, evidence, delays, value, limit, (raised) => {
      if (isWithdrawn) return say.indicatorWithdrawn(view);
      return raised ? say.indicatorRaised(view, causes) : say.indicatorReturned(view);
    });
  }
}

function isRaised(conditions: WatchState['conditions'], { kind, subject }: IndicatorView): boolean {
  return conditions[`${INDICATOR_EVENTS[kind]}/${subject}`]?.raised ?? false;
}
