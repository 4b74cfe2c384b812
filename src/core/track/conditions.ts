import type {
  ChannelDefinition,
  Direction,
  Mode,
  StoreEnd,
  UnitDefinition,
} from '../definitions.js';
import type { Machine, StoreTemperatures } from '../machine/machine.js';
import type { Scan } from '../scan/scan.js';

/** Channel indices of a unit by what they measure; -1 = not there. */
export interface ChannelMap {
  readonly flowSigned: number;
  readonly flowUnsigned: number;
  readonly flowOf: Readonly<Record<Direction, number>>;
  readonly mode: number;
  readonly valveOf: Readonly<Record<Direction, number>>;
  readonly power: number;
  readonly ambient: number;
  readonly gas: Readonly<Record<string, Readonly<Record<StoreEnd, number>>>>;
}

/** Finds the channels of a unit by their roles: indices into `Scan.values`, gas by id of the store. */
export function mapChannels(unit: UnitDefinition): ChannelMap {
  const find = (test: (c: ChannelDefinition) => boolean): number => unit.channels.findIndex(test);
  const flow = (sense: string): number =>
    find((c) => c.role.kind === 'flow' && c.role.sense === sense);
  const valve = (opens: Direction): number =>
    find((c) => c.role.kind === 'valve' && c.role.opens === opens);
  const gas: Record<string, Record<StoreEnd, number>> = {};
  for (const store of unit.stores) {
    const at = (end: StoreEnd): number =>
      find(
        (c) => c.role.kind === 'gas_temperature' && c.role.store === store.id && c.role.end === end,
      );
    gas[store.id] = { charge_inlet: at('charge_inlet'), discharge_inlet: at('discharge_inlet') };
  }
  return {
    flowSigned: flow('signed'),
    flowUnsigned: flow('unsigned'),
    flowOf: { charge: flow('charge'), discharge: flow('discharge') },
    mode: find((c) => c.role.kind === 'mode'),
    valveOf: { charge: valve('charge'), discharge: valve('discharge') },
    power: find((c) => c.role.kind === 'power'),
    ambient: find((c) => c.role.kind === 'ambient_temperature'),
    gas,
  };
}

/** What is remembered from scan to scan to know mode and flow. */
export interface ConditionsState {
  mode: Mode;
  /** Scans in a row below the standing flow. */
  belowStand: number;
  /** Last known signed flow [kg/s] and scans since. */
  lastFlow_kg_s: number;
  flowMissing: number;
  /** Time without a known flow beyond the two held scans [s]. */
  unknown_s: number;
  /** Time that running was told with no flow metered and no power read [s]. */
  idle_s: number;
  /** Scans in which mode channel and flow contradict each other. */
  disagreements: number;
  /** Time since it last ran [s], 0 while it runs; Infinity or absent (a state saved before) = unknown. */
  stood_s?: number;
  /** Direction in which it runs or ran last; null or absent = unknown. */
  ran?: Direction | null;
}

export function startConditions(): ConditionsState {
  return {
    mode: 'stand',
    belowStand: 0,
    lastFlow_kg_s: 0,
    flowMissing: 0,
    unknown_s: 0,
    idle_s: 0,
    disagreements: 0,
    stood_s: Number.POSITIVE_INFINITY,
    ran: null,
  };
}

/** What a unit does in a scan, as `readConditions` makes it out: mode, flow, power, ambient [K]. */
export interface Conditions {
  readonly mode: Mode;
  /** Signed metered flow used for this scan, + = charge [kg/s]. */
  readonly flow_kg_s: number;
  readonly flowKnown: boolean;
  /** The flow follows from power because the meter is silent or refuted. */
  readonly flowStandIn: boolean;
  /** Net power, + = drawn to charge, as the configuration counts it [W]; NaN unknown. */
  readonly power_W: number;
  readonly ambient_K: number;
}

const HELD_SCANS = 2;
const STAND_SCANS = 2;
/** A machine that is told to run may take this long until gas flows [s]; common practice, no source. */
const START_UP_S = 600;
/** With no news of the flow its expected value fades with this time constant [s]. */
const FADE_S = 3600;

/**
 * Mode and flow of a scan. A mode channel (or the valves) wins, else the sign of the flow, else the
 * sign of the power; a flow below `stand_flow_kg_s` for two scans is standing. Contradictions are
 * counted. A missing or refuted flow is held for two scans; then it follows from power and machine,
 * as it always does without a flow channel; where that is silent too it is unknown: what is expected
 * is the last one in the direction told, else fading, and `unknown_s` grows.
 *
 * @param outlets store outlets for a flow by power; see Machine
 */
export function readConditions(
  unit: UnitDefinition,
  map: ChannelMap,
  machine: Machine,
  state: ConditionsState,
  scan: Scan,
  dt_s: number,
  outlets: Readonly<Record<Direction, StoreTemperatures>>,
): Conditions {
  const at = (index: number): number => (index < 0 ? Number.NaN : (scan.values[index] as number));
  const power_W = at(map.power);
  const ambientRead = at(map.ambient);
  const ambient_K = Number.isFinite(ambientRead) ? ambientRead : unit.ambient_K;
  const told = toldDirection(map, at);
  const hasMeter = [map.flowSigned, map.flowUnsigned, map.flowOf.charge, map.flowOf.discharge].some(
    (index) => index >= 0,
  );
  const byPower = flowByPower(unit, machine, told, power_W, outlets, ambient_K);
  const metered = hasMeter ? meteredFlow(unit, map, at, told, power_W) : byPower;
  const refuted = hasMeter && isRefuted(unit, machine, metered, byPower, told, power_W);

  let flow: number;
  let standIn = false;
  if (Number.isFinite(metered) && !refuted) {
    flow = metered;
    state.flowMissing = 0;
  } else {
    state.flowMissing++;
    standIn = state.flowMissing > HELD_SCANS && told !== 0 && Number.isFinite(byPower);
    flow = standIn ? byPower : state.lastFlow_kg_s;
  }
  const missing = state.flowMissing > HELD_SCANS && !standIn && told !== 0;
  if (missing) {
    state.unknown_s += dt_s;
    flow =
      told === null
        ? state.lastFlow_kg_s * Math.exp(-state.unknown_s / FADE_S)
        : told * Math.abs(state.lastFlow_kg_s);
  } else {
    if (state.flowMissing > HELD_SCANS && !standIn) flow = 0;
    else state.lastFlow_kg_s = flow;
    state.unknown_s = 0;
  }
  const standing = Math.abs(flow) < unit.estimator.stand_flow_kg_s;
  state.belowStand = standing ? Math.min(STAND_SCANS, state.belowStand + 1) : 0;
  const against = told !== null && told !== 0 && !standing && Math.sign(flow) !== told;
  // A meter without a sense has its flow signed by what is told, so only its size can contradict.
  const unsigned = at(map.flowUnsigned) >= unit.estimator.stand_flow_kg_s;
  // Running is told, no flow is metered, and no power tells which of the two is right.
  const doubtful =
    hasMeter && told !== null && told !== 0 && Number.isNaN(power_W) && Number.isFinite(metered);
  state.idle_s = doubtful && standing ? state.idle_s + dt_s : 0;
  const idle = state.idle_s > START_UP_S;
  if (refuted || against || idle || (told === 0 && (!standing || unsigned))) state.disagreements++;

  if (told !== null && told !== 0) state.mode = told > 0 ? 'charge' : 'discharge';
  else if (told === 0) state.mode = 'stand';
  else if (!standing) state.mode = flow > 0 ? 'charge' : 'discharge';
  else if (state.belowStand >= STAND_SCANS) state.mode = 'stand';
  if (state.mode === 'stand') state.stood_s = (state.stood_s ?? Number.POSITIVE_INFINITY) + dt_s;
  else {
    state.stood_s = 0;
    state.ran = state.mode;
  }

  return {
    mode: state.mode,
    flow_kg_s: state.belowStand >= STAND_SCANS ? 0 : flow,
    flowKnown: !missing && !idle,
    flowStandIn: standIn,
    power_W,
    ambient_K,
  };
}

/** So many times the standing flow is a flow without doubt. */
const RUNNING_FLOWS = 4;
/** A flow by power beyond so many times the greatest is no flow of this plant. */
const FLOW_MOST = 3;

/**
 * A dead meter (a broken wire reads as no flow) or a frozen one, where mode and power agree against
 * it: running is told, and the power needs a flow, but none is metered that way; or a stand is told
 * and less power seen than the auxiliaries of a running machine, but a flow is metered. As metered it
 * would hold the front, or move it, against all that the thermocouples say. Where no mode is told,
 * power alone refutes a meter that shows no flow, never one that shows the other direction.
 */
function isRefuted(
  unit: UnitDefinition,
  machine: Machine,
  metered: number,
  byPower: number,
  told: number | null,
  power_W: number,
): boolean {
  if (!Number.isFinite(metered) || !Number.isFinite(power_W)) return false;
  const stand = unit.estimator.stand_flow_kg_s;
  const running = RUNNING_FLOWS * stand;
  if (told === 0) {
    return Math.abs(metered) > running && Math.abs(power_W) < machine.auxiliary_running_W;
  }
  const sign = Math.sign(power_W);
  if (!(sign * byPower > running)) return false;
  return told === null ? Math.abs(metered) < stand : told === sign && metered * sign < stand;
}

/** +1, 0, -1 as told by the mode channel or the valves; null where neither tells. */
function toldDirection(map: ChannelMap, at: (index: number) => number): number | null {
  const mode = at(map.mode);
  if (Number.isFinite(mode)) return Math.sign(mode);
  const charge = at(map.valveOf.charge);
  const discharge = at(map.valveOf.discharge);
  if (!Number.isFinite(charge) && !Number.isFinite(discharge)) return null;
  const open = (value: number): boolean => value > 0.5;
  if (open(charge) && !open(discharge)) return 1;
  if (open(discharge) && !open(charge)) return -1;
  return open(charge) && open(discharge) ? null : 0;
}

/** Signed flow by the meters [kg/s]; NaN where they do not tell. */
function meteredFlow(
  unit: UnitDefinition,
  map: ChannelMap,
  at: (index: number) => number,
  told: number | null,
  power_W: number,
): number {
  if (map.flowSigned >= 0) return at(map.flowSigned);
  const stand = unit.estimator.stand_flow_kg_s;
  if (map.flowUnsigned >= 0) {
    const flow = at(map.flowUnsigned);
    if (flow < stand) return 0;
    const direction = told ?? (Number.isFinite(power_W) ? Math.sign(power_W) : null);
    return direction === null ? Number.NaN : direction * flow;
  }
  const charge = at(map.flowOf.charge);
  const discharge = at(map.flowOf.discharge);
  if (!Number.isFinite(charge) && !Number.isFinite(discharge)) return Number.NaN;
  const flow =
    (Number.isFinite(charge) ? charge : 0) - (Number.isFinite(discharge) ? discharge : 0);
  // An idle meter says nothing of what its silent fellow would read, unless all is told to stand.
  const silent = (way: Direction): boolean =>
    map.flowOf[way] >= 0 && !Number.isFinite(at(map.flowOf[way]));
  const blind = (silent('charge') && told !== -1) || (silent('discharge') && told !== 1);
  return blind && told !== 0 && Math.abs(flow) < stand ? Number.NaN : flow;
}

/** Signed flow at which the machine takes or gives the power [kg/s]; NaN where that is not known. */
function flowByPower(
  unit: UnitDefinition,
  machine: Machine,
  told: number | null,
  power_W: number,
  outlets: Readonly<Record<Direction, StoreTemperatures>>,
  ambient_K: number,
): number {
  if (told === 0) return 0;
  if (!Number.isFinite(power_W)) return Number.NaN;
  const direction = told ?? Math.sign(power_W);
  if (direction === 0) return 0;
  const way: Direction = direction > 0 ? 'charge' : 'discharge';
  const answer = machine.flowForPower(way, Math.abs(power_W), outlets[way], ambient_K);
  if ('reason' in answer) return answer.reason === 'no_work' ? Number.NaN : 0;
  const most =
    FLOW_MOST * Math.max(unit.limits.charge.flow_max_kg_s, unit.limits.discharge.flow_max_kg_s);
  return answer.flow_kg_s > most ? Number.NaN : direction * answer.flow_kg_s;
}
