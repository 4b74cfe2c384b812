import type { Direction, GasCycleDefinition, UnitDefinition } from '../definitions.js';
import { createMachine } from '../machine/machine.js';

/** How a machine may differ from its definition, in ln of its specific work w. */
export interface MachineSpread {
  /** Variances and covariance of e_charge and e_discharge, the errors of ln w at rated flow. */
  readonly variance: Readonly<Record<Direction, number>>;
  readonly covariance: number;
  /** One sigma of ln w from the thermometers at the outlets, which no averaging removes. */
  readonly outlets: Readonly<Record<Direction, number>>;
  /** d ln w over (flow/rated flow)^2: what the loop's loss does in part load; its sigma as a share. */
  readonly partLoad: Readonly<Record<Direction, number>>;
  readonly partLoadSigma: number;
  /** Flow that rated power takes from full stores [kg/s]. */
  readonly ratedFlow_kg_s: number;
}

/**
 * One sigma of each parameter of a cycle as built, in points: +/-1.5 for the two polytropic
 * efficiencies and +/-2 for the loop's loss, anywhere within; +/-1 for motor and generator (common
 * practice for machines of a few MW). They are scaled together so that e_discharge has the
 * configured `machine_factor_sigma`: what counts here is how charging and discharging hang together.
 */
const PARAMETERS: readonly [keyof GasCycleDefinition, number][] = [
  ['compressor_polytropic_efficiency', 0.0087],
  ['expander_polytropic_efficiency', 0.0087],
  ['loop_pressure_loss', 0.0115],
  ['motor_efficiency', 0.0058],
  ['generator_efficiency', 0.0058],
];
/** Thermometers in the pipes are the better instruments, often doubled: +/-1 K. */
const OUTLET_SIGMA_K = 0.5;
/**
 * Share of the loop's loss that follows the square of the flow, as friction does; valves that hold
 * a pressure and coolers under control do not. Where the configuration does not say, half of it
 * with a sigma of a quarter: anything between none and all.
 */
const FOLLOWS = { share: 0.5, sigma: 0.25 };

const known = new WeakMap<UnitDefinition, MachineSpread>();

/**
 * Spread of a unit's machine, from finite differences of ln w about full stores while discharging
 * and empty ones while charging. Remembered with the (frozen) definition.
 *
 * A better compressor or expander takes less work while charging and gives more while discharging:
 * the two errors are opposed, and what charging tells of the machine is worth half a discharge.
 */
export function machineSpread(unit: UnitDefinition): MachineSpread {
  const before = known.get(unit);
  if (before !== undefined) return before;
  const made = spreadOf(unit);
  known.set(unit, made);
  return made;
}

function spreadOf(unit: UnitDefinition): MachineSpread {
  const hot = unit.stores.find((s) => s.kind === 'hot');
  const cold = unit.stores.find((s) => s.kind === 'cold');
  const at = {
    charge: {
      hot_K: hot?.reference_cold_K ?? unit.ambient_K,
      cold_K: cold?.reference_hot_K ?? null,
    },
    discharge: {
      hot_K: hot?.reference_hot_K ?? unit.ambient_K,
      cold_K: cold?.reference_cold_K ?? null,
    },
  };
  const lnWork = (direction: Direction, machine = unit.machine, outlets = at[direction]): number =>
    Math.log(createMachine(machine).operate(direction, outlets, unit.ambient_K).specificWork_J_kg);
  const both = (of: (direction: Direction) => number): Record<Direction, number> => ({
    charge: of('charge'),
    discharge: of('discharge'),
  });
  const base = both((d) => lnWork(d));
  const outlets = both((d) => {
    const { hot_K, cold_K } = at[d];
    const byHot = lnWork(d, unit.machine, { hot_K: hot_K + 1, cold_K }) - base[d];
    const byCold =
      cold_K === null ? 0 : lnWork(d, unit.machine, { hot_K, cold_K: cold_K + 1 }) - base[d];
    return OUTLET_SIGMA_K * Math.hypot(byHot, byCold);
  });
  const work = Math.exp(base.discharge);
  const ratedFlow_kg_s = (unit.rated_power_W + unit.machine.auxiliary_running_W) / work;
  const sigma = unit.estimator.machine_factor_sigma;
  const { machine } = unit;
  if (machine.kind !== 'gas_cycle') {
    // A heater and an engine have nothing in common.
    return {
      variance: both(() => sigma * sigma),
      covariance: 0,
      outlets,
      partLoad: both(() => 0),
      partLoadSigma: 0,
      ratedFlow_kg_s,
    };
  }
  const slope = (name: keyof GasCycleDefinition): Record<Direction, number> => {
    const step = -1e-3;
    const other = { ...machine, [name]: (machine[name] as number) + step };
    return both((d) => (lnWork(d, other) - base[d]) / step);
  };
  let cc = 0;
  let cd = 0;
  let dd = 0;
  for (const [name, points] of PARAMETERS) {
    if (name === 'loop_pressure_loss' && machine.loop_pressure_loss < 2e-3) continue;
    const by = slope(name);
    cc += (by.charge * points) ** 2;
    cd += by.charge * by.discharge * points * points;
    dd += (by.discharge * points) ** 2;
  }
  const scale = (sigma * sigma) / dd;
  const loss = machine.loop_pressure_loss;
  const byLoss = loss < 2e-3 ? both(() => 0) : slope('loop_pressure_loss');
  const share = machine.loss_follows_flow ?? FOLLOWS.share;
  const partLoad = both((d) => byLoss[d] * loss * share);
  return {
    variance: { charge: cc * scale, discharge: dd * scale },
    covariance: cd * scale,
    outlets,
    partLoad,
    partLoadSigma: machine.loss_follows_flow === undefined ? FOLLOWS.sigma / FOLLOWS.share : 0,
    ratedFlow_kg_s,
  };
}

/** Beyond this share of the rated flow the loss law is not carried on. */
const PART_LOAD_MOST = 1.5;

/** w at a flow over w at rated flow: exp(partLoad ((m/m_rated)^2 - 1)). */
export function partLoadFactor(
  spread: MachineSpread,
  direction: Direction,
  flow_kg_s: number,
): number {
  const load = Math.min(PART_LOAD_MOST, Math.abs(flow_kg_s) / spread.ratedFlow_kg_s);
  return Math.exp(spread.partLoad[direction] * (load * load - 1));
}
