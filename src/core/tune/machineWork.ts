import type { Direction, UnitDefinition } from '../definitions.js';
import type { Machine, StoreTemperatures } from '../machine/machine.js';
import type { TuneRecord } from './record.js';

/** ln of the plant's power per metered kilogram over the machine model's, and its sigma. */
export interface MachineWork {
  readonly log: number;
  readonly sigma: number;
  readonly hours: number;
}

/** After a start or a turn the loop, its steel and the sensors settle for this long [s]. */
const SETTLE_S = 900;
/** Less running than this tells nothing of a machine [h]. */
const LEAST_H = 0.5;
/** Ratios beyond these are no machine's but a fault of a meter. */
const RATIO = [0.3, 3] as const;

/**
 * Mean of ln((|P| -/+ auxiliaries)/(m w)) over all settled bins of a direction, w of the machine model
 * at the measured outlets. Its sigma: an outlet may be read wrong throughout, by the inlet sigma of the
 * configuration (its effect on w by difference quotients), and runs differ among themselves.
 *
 * @returns null where power, flow or outlets are missing in that direction
 */
export function machineWork(
  unit: UnitDefinition,
  machine: Machine,
  record: TuneRecord,
  direction: Direction,
): MachineWork | null {
  const sign = direction === 'charge' ? 1 : -1;
  const gross = (power_W: number) => Math.abs(power_W) - sign * machine.auxiliary_running_W;
  const byRun = new Map<number, { sum: number; n: number }>();
  let seconds = 0;
  let hot = 0;
  let cold = 0;
  for (const bin of record.bins) {
    if (Math.sign(bin.flow_kg_s) !== sign || bin.since_s < SETTLE_S) continue;
    const { outlets } = bin;
    if (!Number.isFinite(bin.power_W) || !Number.isFinite(outlets.hot_K)) continue;
    if (outlets.cold_K !== null && !Number.isFinite(outlets.cold_K)) continue;
    const work = machine.operate(direction, outlets, bin.ambient_K).specificWork_J_kg;
    const ratio = gross(bin.power_W) / (Math.abs(bin.flow_kg_s) * work);
    if (!(ratio > RATIO[0] && ratio < RATIO[1])) continue;
    const run = byRun.get(bin.run) ?? { sum: 0, n: 0 };
    run.sum += Math.log(ratio);
    run.n++;
    byRun.set(bin.run, run);
    seconds += bin.dt_s;
    const outlet = sensitivity(machine, direction, outlets, bin.ambient_K);
    hot += outlet.hot;
    cold += outlet.cold;
  }
  const runs = [...byRun.values()];
  const bins = runs.reduce((n, run) => n + run.n, 0);
  if (seconds < LEAST_H * 3600) return null;
  const log = runs.reduce((sum, run) => sum + run.sum, 0) / bins;
  const spread =
    runs.length < 2
      ? SINGLE_RUN
      : Math.sqrt(
          runs.reduce((sum, run) => sum + (run.sum / run.n - log) ** 2, 0) /
            (runs.length - 1) /
            runs.length,
        );
  const T = unit.estimator.inlet_sigma_K;
  return {
    log,
    sigma: Math.hypot(spread, (T * hot) / bins, (T * cold) / bins),
    hours: seconds / 3600,
  };
}

/** One run alone does not tell by how much runs differ: taken as 1 %, judgement. */
const SINGLE_RUN = 0.01;

/** d ln w by a kelvin at each outlet [1/K]. */
function sensitivity(
  machine: Machine,
  direction: Direction,
  outlets: StoreTemperatures,
  ambient_K: number,
): { hot: number; cold: number } {
  const ln = (hot_K: number, cold_K: number | null) =>
    Math.log(machine.operate(direction, { hot_K, cold_K }, ambient_K).specificWork_J_kg);
  const { hot_K, cold_K } = outlets;
  return {
    hot: ln(hot_K + 0.5, cold_K) - ln(hot_K - 0.5, cold_K) || 0,
    cold: cold_K === null ? 0 : ln(hot_K, cold_K + 0.5) - ln(hot_K, cold_K - 0.5) || 0,
  };
}
