import { temperatureAt } from '../bed/tables.js';
import type {
  FrontEstimate,
  FrontReason,
  FrontViewEstimate,
  RejectedSensor,
  SensorReading,
  StoreEstimate,
  StringEstimate,
  TubeProfile,
} from '../estimate.js';
import { type Covariance, frontSigma } from './frontSigma.js';
import { type FoundFront, findFronts } from './fronts.js';
import type { StoreEnergy } from './storeEnergy.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import { streamsOf } from './streams.js';
import { type TubeModel, type TubeState, tubeTemperatures } from './tube.js';
import { storeEnergyPosition } from './unseenFlow.js';

/** Area-mean temperatures [K]. */
export function meanTemperatures(model: StoreModel, state: StoreState): Float64Array {
  const cells = (model.tubes[0] as TubeModel).layout.cells;
  const mean = new Float64Array(cells);
  for (const { share, enthalpy } of streamsOf(model, state)) {
    for (let i = 0; i < cells; i++) {
      const t = temperatureAt(model.tables, enthalpy[i] as number);
      mean[i] = (mean[i] as number) + share * t;
    }
  }
  return mean;
}

/** Area-mean temperature of one cell [K], as `meanTemperatures` has it. */
export function meanTemperatureAt(model: StoreModel, state: StoreState, cell: number): number {
  let mean = 0;
  for (const { share, enthalpy } of streamsOf(model, state)) {
    mean += share * temperatureAt(model.tables, enthalpy[cell] as number);
  }
  return mean;
}

/**
 * Fronts of the store's area-mean profile with their sigmas, ordered by x.
 *
 * @param mean_K that profile
 */
export function storeFronts(
  model: StoreModel,
  state: StoreState,
  energy: StoreEnergy,
  mean_K = meanTemperatures(model, state),
): { fronts: FrontEstimate[]; reason: FrontReason | null } {
  if (!state.started) return { fronts: [], reason: 'not_started' };
  const { store } = model;
  const found = findFronts(model.x_m, mean_K, store.reference_hot_K, store.reference_cold_K);
  const covariance = meanCovariance(model, state, energy.correlation);
  const unseen_m = energy.unseen * store.bed.length_m;
  return {
    fronts: found.fronts.map((f) => describe(f, covariance, unseen_m)),
    reason: found.reason,
  };
}

/** Gas that leaves the store, mixed by flow [K]; NaN while standing. */
export function mixedOutlet(model: StoreModel, state: StoreState): number {
  let heat = 0;
  let flow = 0;
  for (const { share, flowFactor, outlet_K } of streamsOf(model, state)) {
    heat += share * flowFactor * outlet_K;
    flow += share * flowFactor;
  }
  return heat / flow;
}

/** What a store publishes, but for the front views and the spread ratio, which come from outside. */
export function estimateStore(
  model: StoreModel,
  state: StoreState,
  extra: {
    front_views: FrontViewEstimate[];
    spread_ratio: number | null;
    flowing: boolean;
    fronts: ReturnType<typeof storeFronts>;
    /** Of each tube; see `tubeFronts`. */
    tubeFronts: readonly (readonly FrontEstimate[])[];
    energy: StoreEnergy;
  },
): StoreEstimate {
  const { energy } = extra;
  const { store } = model;
  const outlet = mixedOutlet(model, state);
  const transfer = meanFactor(model, state, 'transfer');
  return {
    soc: energy.soc,
    soc_sigma: energy.soc_sigma,
    stored_MWh_th: energy.stored_MWh_th,
    stored_sigma_MWh_th: energy.stored_sigma_MWh_th,
    fronts: extra.fronts.fronts,
    fronts_reason: extra.fronts.reason,
    energy_position_m: storeEnergyPosition(model, state),
    spread_ratio: extra.spread_ratio,
    heat_transfer_factor: store.bed.heat_transfer_factor * transfer.value,
    heat_transfer_factor_sigma: store.bed.heat_transfer_factor * transfer.sigma,
    strings: model.tubes.map((tube, k) =>
      describeString(tube, state.tubes[k] as TubeState, extra.tubeFronts[k]?.[0]),
    ),
    front_views: extra.front_views,
    sensors: { used: state.used, rejected: rejectedSensors(model, state) },
    outlet_K: extra.flowing && Number.isFinite(outlet) ? outlet : null,
  };
}

/** Covariance of the area-mean profile: the tubes' mean, scaled by how far their errors are shared. */
function meanCovariance(model: StoreModel, state: StoreState, correlation: number): Covariance {
  return (i, j) => {
    let sum = 0;
    model.tubes.forEach((tube, k) => {
      const p = (state.tubes[k] as TubeState).covariance;
      sum += tube.string.area_share * (p[i * tube.layout.size + j] as number);
    });
    return sum * correlation;
  };
}

function describe(front: FoundFront, covariance: Covariance, unseen_m: number): FrontEstimate {
  const sigma = frontSigma(front, covariance);
  return {
    position_m: front.position_m,
    position_sigma_m: Math.hypot(sigma.position_sigma_m, unseen_m),
    width_m: front.width_m,
    width_sigma_m: sigma.width_sigma_m,
  };
}

/** Fronts of one tube, ordered by x, with their sigmas. */
export function tubeFronts(model: StoreModel, tube: TubeModel, state: TubeState): FrontEstimate[] {
  const { store } = model;
  const { size, cells } = tube.layout;
  const own = tubeTemperatures(tube, state, new Float64Array(cells));
  const { fronts } = findFronts(model.x_m, own, store.reference_hot_K, store.reference_cold_K);
  return fronts.map((front) =>
    describe(front, (i, j) => state.covariance[i * size + j] as number, 0),
  );
}

function describeString(
  tube: TubeModel,
  state: TubeState,
  front: FrontEstimate | undefined,
): StringEstimate {
  const { flow, size, cells } = tube.layout;
  const factor = Math.exp(state.further[flow - cells] as number);
  return {
    id: tube.string.id,
    flow_factor: factor,
    flow_factor_sigma: factor * Math.sqrt(state.covariance[flow * size + flow] as number),
    position_m: front?.position_m ?? null,
    width_m: front?.width_m ?? null,
  };
}

/** Area-weighted mean of a factor over the tubes, and its sigma (errors taken as independent). */
export function meanFactor(
  model: StoreModel,
  state: StoreState,
  which: 'flow' | 'transfer',
): { value: number; sigma: number } {
  let sum = 0;
  let variance = 0;
  model.tubes.forEach((tube, k) => {
    const tubeState = state.tubes[k] as TubeState;
    const index = tube.layout[which];
    const w = tube.string.area_share;
    sum += w * (tubeState.further[index - tube.layout.cells] as number);
    variance += w * w * (tubeState.covariance[index * tube.layout.size + index] as number);
  });
  const value = Math.exp(sum);
  return { value, sigma: value * Math.sqrt(variance) };
}

/** Thermocouples with a verdict, by string and place; those of a `group_fault` are used on none the less. */
export function rejectedSensors(model: StoreModel, state: StoreState): RejectedSensor[] {
  const out: RejectedSensor[] = [];
  model.tubes.forEach((tube, k) => {
    tube.string.thermocouples.forEach((thermocouple, s) => {
      const memory = state.sensors[k]?.[s];
      if (memory === undefined || memory.verdict === null) return;
      out.push({
        id: thermocouple.id,
        verdict: memory.verdict,
        since: new Date(memory.since_ms).toISOString(),
        evidence: memory.evidence,
      });
    });
  });
  return out;
}

/** Profiles and readings for pages and reports. */
export function profileOf(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
): { x_m: number[]; tubes: TubeProfile[]; mean_K: number[]; readings: SensorReading[] } {
  const tubes: TubeProfile[] = [];
  const readings: SensorReading[] = [];
  model.tubes.forEach((tube, k) => {
    const { cells, size } = tube.layout;
    const tubeState = state.tubes[k] as TubeState;
    const t = tubeTemperatures(tube, tubeState, new Float64Array(cells));
    tubes.push({
      id: tube.string.id,
      temperature_K: Array.from(t),
      sigma_K: Array.from(t, (_, i) =>
        Math.sqrt(Math.max(0, tubeState.covariance[i * size + i] as number)),
      ),
    });
    tube.string.thermocouples.forEach((thermocouple, s) => {
      const value = values[model.channels[k]?.[s] as number] as number;
      readings.push({
        id: thermocouple.id,
        string: tube.string.id,
        position_m: thermocouple.position_m,
        value_K: Number.isFinite(value) ? value : null,
        verdict: state.sensors[k]?.[s]?.verdict ?? null,
      });
    });
  });
  return {
    x_m: Array.from(model.x_m),
    tubes,
    mean_K: Array.from(meanTemperatures(model, state)),
    readings,
  };
}
