import { enthalpyAt, fluidEnthalpyAt } from '../bed/tables.js';
import type { FrontEstimate, FrontViewEstimate, SensorVerdict } from '../estimate.js';
import {
  startTwin,
  stepTwin,
  type TwinModel,
  type TwinState,
  twinModel,
} from '../watch/healthyTwin.js';
import { type SpreadRatio, spreadRatio } from '../watch/spreadRatio.js';
import {
  disagreement,
  type FrontViewState,
  type FrontViewStep,
  startFrontView,
  stepFrontView,
} from './frontView.js';
import { frontSpeed, frontSpread } from './frontViewTravel.js';
import { meanFactor } from './storeEstimate.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeDrive, TubeModel } from './tube.js';
import { storeEnergyPosition } from './unseenFlow.js';

/** Maintenance's view of a store: the front view of each string, and the healthy twin. Plain. */
export interface StoreViews {
  /** null for a string with fewer than two thermocouples: it cannot see a front. */
  readonly views: (FrontViewState | null)[];
  readonly twin: TwinState;
  /** Sense of the last flow, for comparing widths while standing. */
  direction: 1 | -1;
}

/** Relative uncertainty of a travel computed from the metered flow. */
const TRAVEL_SHARE = 0.1;

export function startViews(model: StoreModel): StoreViews {
  return {
    views: model.tubes.map((tube) =>
      tube.layout.sensors >= 2 ? startFrontView(tube.string) : null,
    ),
    twin: startTwin(),
    direction: 1,
  };
}

const twins = new WeakMap<StoreModel, TwinModel>();

/** The twin's model of a store, built on the first call. */
export function twinOf(model: StoreModel): TwinModel {
  let twin = twins.get(model);
  if (twin === undefined) {
    twin = twinModel(model.store, model.tables, (model.tubes[0] as TubeModel).layout.cells);
    twins.set(model, twin);
  }
  return twin;
}

/**
 * Takes one scan into the front views and the twin, after the tubes have taken it.
 *
 * The front views stay independent of the tubes: they get the readings of the sensors that stand,
 * the travel by the metered flow, and the growth that the configured bed would show. The twin gets
 * flow (times the filter's mean flow factor), inlet and ambient.
 *
 * @param drive null for the first scan
 * @param mean_K area-mean profile of the tubes, its fronts in `fronts`
 */
export function stepViews(
  model: StoreModel,
  state: StoreState,
  views: StoreViews,
  drive: TubeDrive | null,
  values: Float64Array,
  fronts: readonly FrontEstimate[],
  mean_K: Float64Array,
  unknownTravel_m: number,
): FrontViewStep[] {
  if (drive !== null && drive.massFlux_kg_m2s !== 0) {
    views.direction = drive.massFlux_kg_m2s > 0 ? 1 : -1;
  }
  if (state.started && drive !== null) {
    stepTwin(twinOf(model), views.twin, {
      massFlux_kg_m2s: drive.massFlux_kg_m2s * meanFactor(model, state, 'flow').value,
      inlet_K: drive.inlet_K,
      ambient_K: drive.ambient_K,
      dt_s: drive.dt_s,
      unknownTravel_m,
      mean_K,
      fronts,
    });
  }
  const motion = expectedMotion(model, drive);
  const { store } = model;
  const charged = store.kind === 'hot';
  return model.tubes.flatMap((tube, k) => {
    const view = views.views[k];
    if (view === null || view === undefined) return [];
    const { estimator } = tube;
    const lasting = Math.hypot(estimator.offset_sigma_K, estimator.group_offset_sigma_K);
    const readings = tube.string.thermocouples.map((thermocouple, s) => ({
      x_m: thermocouple.position_m,
      temperature_K: mayShowFront(state.sensors[k]?.[s]?.verdict ?? null)
        ? (values[model.channels[k]?.[s] as number] as number)
        : Number.NaN,
      sigma_K: estimator.reading_sigma_K,
      lasting_K: lasting,
      place_m: estimator.position_sigma_m,
    }));
    return stepFrontView(view, {
      readings,
      references: {
        charged_K: charged ? store.reference_hot_K : store.reference_cold_K,
        discharged_K: charged ? store.reference_cold_K : store.reference_hot_K,
      },
      length_m: store.bed.length_m,
      travel_m: motion.travel_m,
      travelSigma_m: Math.hypot(TRAVEL_SHARE * motion.travel_m, drive?.travelSigma_m ?? 0),
      spread_m2: motion.spread_m2,
      readingShift_m: estimator.gas_share * motion.lag_m,
      readingShiftSigma_m: estimator.gas_share_sigma * Math.abs(motion.lag_m),
    });
  });
}

/**
 * Verdicts drawn from the tubes' prediction do not keep a reading from the front view: it would lose
 * its independence where a front degrades faster than the tubes follow. It judges for itself.
 */
function mayShowFront(verdict: SensorVerdict | null): boolean {
  return verdict === null || verdict === 'offset' || verdict === 'drifting';
}

/** Travel by the metered flow, signed gas lag, and growth of width squared that the configured bed would show. */
function expectedMotion(
  model: StoreModel,
  drive: TubeDrive | null,
): { travel_m: number; spread_m2: number; lag_m: number } {
  if (drive === null) return { travel_m: 0, spread_m2: 0, lag_m: 0 };
  const { tables, store } = model;
  const { reference_hot_K: hot, reference_cold_K: cold, bed } = store;
  const gasStep = fluidEnthalpyAt(tables, hot) - fluidEnthalpyAt(tables, cold);
  const bedStep = enthalpyAt(tables, hot) - enthalpyAt(tables, cold);
  const flux = drive.massFlux_kg_m2s;
  const travel_m = frontSpeed(flux, gasStep, bedStep) * drive.dt_s;
  const s = tables.segments >> 1;
  const cf = tables.fluidHeatCapacity[s] as number;
  const film =
    (tables.filmStill[s] as number) + (tables.filmFlow[s] as number) * Math.abs(flux) ** 0.6;
  const hv =
    (bed.heat_transfer_factor * tables.surface_m2_m3 * film) /
    (1 + film * (tables.particleResistance[s] as number));
  const conductivity =
    (tables.stagnant[s] as number) + tables.mixing * Math.abs(flux) * cf * bed.particle_diameter_m;
  const lag = (Math.abs(flux) * cf) / hv;
  const spread_m2 = frontSpread(
    travel_m,
    lag,
    conductivity,
    tables.heatCapacity[s] as number,
    drive.dt_s,
  );
  return { travel_m, spread_m2, lag_m: Math.sign(flux) * lag };
}

/** Front views with their disagreement with the nearest front of the same string's tube. */
export function describeViews(
  model: StoreModel,
  tubeFronts: readonly (readonly FrontEstimate[])[],
  steps: readonly FrontViewStep[],
): FrontViewEstimate[] {
  return steps.map((step) => {
    const k = model.tubes.findIndex((tube) => tube.string.id === step.id);
    const nearest = (tubeFronts[k] ?? []).reduce<FrontEstimate | null>(
      (best, next) =>
        best === null ||
        Math.abs((next.position_m as number) - (step.position_m ?? 0)) <
          Math.abs((best.position_m as number) - (step.position_m ?? 0))
          ? next
          : best,
      null,
    );
    return {
      id: step.id,
      position_m: step.position_m,
      position_sigma_m: step.position_sigma_m,
      width_m: step.width_m,
      width_sigma_m: step.width_sigma_m,
      seen: step.seen,
      disagreement: step.seen
        ? disagreement(step, nearest?.position_m ?? null, nearest?.position_sigma_m ?? null)
        : null,
    };
  });
}

/** Measured over healthy width of a store's fronts; null where there is none to compare. */
export function storeSpread(
  model: StoreModel,
  state: StoreState,
  views: StoreViews,
  fronts: readonly FrontEstimate[],
): SpreadRatio | null {
  const position = storeEnergyPosition(model, state);
  return spreadRatio(twinOf(model), views.twin, fronts, views.direction, position);
}
