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
  /** Scans in which mode channel and flow contradict each other. */
  disagreements: number;
}

export function startConditions(): ConditionsState {
  return {
    mode: 'stand',
    belowStand: 0,
    lastFlow_kg_s: 0,
    flowMissing: 0,
    unknown_s: 0,
    disagreements: 0,
  };
}

export interface Conditions {
  readonly mode: Mode;
  /** Signed metered flow used for this scan, + = charge [kg/s]. */
  readonly flow_kg_s: number;
  readonly flowKnown: boolean;
  /** Net power, + = drawn to charge, as the configuration counts it [W]; NaN unknown. */
  readonly power_W: number;
  readonly ambient_K: number;
}

const HELD_SCANS = 2;
const STAND_SCANS = 2;
/** With no news of the flow its expected value fades with this time constant [s]. */
const FADE_S = 3600;

/**
 * Mode and flow of a scan. A mode channel (or the valves) wins, else the sign of the flow, else the
 * sign of the power; a flow below `stand_flow_kg_s` for two scans is standing. Contradictions are
 * counted. A missing flow is held for two scans; then it is unknown: its expectation fades and
 * `unknown_s` grows. Without any flow channel the flow follows from power and machine.
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
  const measured = measuredFlow(unit, map, machine, at, told, power_W, outlets, ambient_K);

  let flow: number;
  if (Number.isFinite(measured)) {
    flow = measured;
    state.lastFlow_kg_s = flow;
    state.flowMissing = 0;
    state.unknown_s = 0;
  } else {
    state.flowMissing++;
    if (state.flowMissing > HELD_SCANS) {
      state.unknown_s += dt_s;
      flow = told === 0 ? 0 : state.lastFlow_kg_s * Math.exp(-state.unknown_s / FADE_S);
      if (told === 0) state.unknown_s = 0;
    } else flow = state.lastFlow_kg_s;
  }
  const standing = Math.abs(flow) < unit.estimator.stand_flow_kg_s;
  state.belowStand = standing ? Math.min(STAND_SCANS, state.belowStand + 1) : 0;
  if (told !== null && told !== 0 && !standing && Math.sign(flow) !== told) state.disagreements++;
  // A meter without a sense has its flow signed by what is told, so only its size can contradict.
  const unsigned = at(map.flowUnsigned) >= unit.estimator.stand_flow_kg_s;
  if (told === 0 && (!standing || unsigned)) state.disagreements++;

  if (told !== null && told !== 0) state.mode = told > 0 ? 'charge' : 'discharge';
  else if (told === 0) state.mode = 'stand';
  else if (!standing) state.mode = flow > 0 ? 'charge' : 'discharge';
  else if (state.belowStand >= STAND_SCANS) state.mode = 'stand';

  return {
    mode: state.mode,
    flow_kg_s: state.belowStand >= STAND_SCANS ? 0 : flow,
    flowKnown: state.flowMissing <= HELD_SCANS || told === 0,
    power_W,
    ambient_K,
  };
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

function measuredFlow(
  unit: UnitDefinition,
  map: ChannelMap,
  machine: Machine,
  at: (index: number) => number,
  told: number | null,
  power_W: number,
  outlets: Readonly<Record<Direction, StoreTemperatures>>,
  ambient_K: number,
): number {
  if (map.flowSigned >= 0) return at(map.flowSigned);
  if (map.flowOf.charge >= 0 || map.flowOf.discharge >= 0) {
    const charge = at(map.flowOf.charge);
    const discharge = at(map.flowOf.discharge);
    if (!Number.isFinite(charge) && !Number.isFinite(discharge)) return Number.NaN;
    const flow =
      (Number.isFinite(charge) ? charge : 0) - (Number.isFinite(discharge) ? discharge : 0);
    // An idle meter says nothing of what its silent fellow would read, unless all is told to stand.
    const silent = (way: Direction): boolean =>
      map.flowOf[way] >= 0 && !Number.isFinite(at(map.flowOf[way]));
    const blind = (silent('charge') && told !== -1) || (silent('discharge') && told !== 1);
    if (blind && told !== 0 && Math.abs(flow) < unit.estimator.stand_flow_kg_s) return Number.NaN;
    return flow;
  }
  const byPower = Number.isFinite(power_W) ? Math.sign(power_W) : null;
  const direction = told ?? byPower;
  if (map.flowUnsigned >= 0) {
    const flow = at(map.flowUnsigned);
    if (flow < unit.estimator.stand_flow_kg_s) return 0;
    return direction === null ? Number.NaN : direction * flow;
  }
  if (!Number.isFinite(power_W)) return told === 0 ? 0 : Number.NaN;
  if (direction === 0) return 0;
  const way: Direction = (direction as number) > 0 ? 'charge' : 'discharge';
  const answer = machine.flowForPower(way, Math.abs(power_W), outlets[way], ambient_K);
  if ('reason' in answer) return 0;
  return way === 'charge' ? answer.flow_kg_s : -answer.flow_kg_s;
}
