import {
  type BedStep,
  type BedWork,
  bedSubstep,
  createBedWork,
  planSubsteps,
  wallLossPerVolume,
} from '../bed/kernel.js';
import { parameterColumns } from '../bed/parameterTangent.js';
import { createPropagation, propagate } from '../bed/propagate.js';
import { type BedTables, enthalpyAt, temperatureAt } from '../bed/tables.js';
import { type BedTangent, createBedTangent, linearise } from '../bed/tangent.js';
import type { EstimatorDefinition, StoreDefinition, StringDefinition } from '../definitions.js';
import { layoutOf, type TubeLayout } from './layout.js';
import { loosenPositions } from './places.js';
import { addProcessNoise } from './processNoise.js';

/** What never changes of one stream tube. */
export interface TubeModel {
  readonly store: StoreDefinition;
  readonly string: StringDefinition;
  readonly estimator: EstimatorDefinition;
  readonly tables: BedTables;
  readonly layout: TubeLayout;
  /** Wall loss of this tube per volume [W/m3K]. */
  readonly wallLoss_W_m3K: number;
}

/**
 * State of one stream tube: enthalpy of each cell [J/m3 of bed], the further states (their
 * positions less `layout.cells`, see TubeLayout), and the covariance of temperatures [K] and
 * further states, symmetric, row-major.
 */
export interface TubeState {
  readonly enthalpy: Float64Array;
  readonly further: Float64Array;
  readonly covariance: Float64Array;
  /** Gas-to-rock lag at the last step, signed by the flow [m]. */
  readonly gasLag_m: Float64Array;
  /** The gas of the last step, to which `gasLag_m` belongs; absent before the first that kept it. */
  gas?: TubeGas;
  /** Mean temperature of the gas that left in the last step [K], NaN while standing. */
  outlet_K: number;
  /** Running mean of the innovations' squares over what was expected, per reading; 1 = as expected. */
  surprise: number;
}

/** Gas that was driven through a tube in a step, and the states that it was reckoned with. */
export interface TubeGas {
  /** As measured or assumed, without the state of its offset [K]. */
  readonly inlet_K: number;
  /** Of an inlet that is assumed, 0 where it is measured [K]. */
  readonly inletSigma_K: number;
  /** ln flow factor and ln phi_h, and d ln l/d ln G = 1 - d ln hv/d ln G in the middle of the bed. */
  readonly flow: number;
  readonly transfer: number;
  readonly flowSlope: number;
}

/** Arrays that the steps of one size share; never part of the state. */
export interface TubeScratch {
  readonly work: BedWork;
  readonly probe: BedWork;
  readonly tangent: BedTangent;
  /** Of `propagate`. */
  readonly propagation: Float64Array;
  readonly flowColumn: Float64Array;
  readonly transferColumn: Float64Array;
  readonly leakColumn: Float64Array;
  readonly slope: Float64Array;
  readonly temperature: Float64Array;
  readonly gain: Float64Array;
  /** P H' of each thermocouple. */
  readonly projections: readonly Float64Array[];
}

export function tubeModel(
  store: StoreDefinition,
  string: StringDefinition,
  unitEstimator: EstimatorDefinition,
  tables: BedTables,
): TubeModel {
  const estimator =
    store.gas_share === undefined
      ? unitEstimator
      : { ...unitEstimator, gas_share: store.gas_share };
  // Heat lost through the mantle is felt near the wall first (2 sqrt(alpha t), about 0.6 m a day):
  // the outermost tube carries it all, the inner ones none.
  const outermost = store.strings.reduce((a, b) => (b.radius_m > a.radius_m ? b : a));
  // Where the wall's steel is known, a zone of its own carries it instead: see wallZone.
  const zone = (store.bed.wall_capacity_J_m2K ?? 0) > 0;
  const share = outermost.id === string.id && !zone ? 1 / string.area_share : 0;
  return {
    store,
    string,
    estimator,
    tables,
    layout: layoutOf(string, estimator),
    wallLoss_W_m3K: wallLossPerVolume(tables, share),
  };
}

/** Arrays of all stores' tubes, by size and place among a store's. */
const shared = new Map<string, TubeScratch>();
const MOST_SHARED = 256;

/**
 * Arrays for the k-th tube of a store. Stores share them, since a store's scan is worked off in one
 * go: so much less memory for many units. Whoever stops amid one needs its own, `createTubeScratch`.
 */
export function sharedTubeScratch(layout: TubeLayout, k: number): TubeScratch {
  const key = [layout.cells, layout.size, layout.sensors, k].join();
  const known = shared.get(key);
  if (known !== undefined) return known;
  if (shared.size >= MOST_SHARED) shared.clear();
  const scratch = createTubeScratch(layout);
  shared.set(key, scratch);
  return scratch;
}

export function createTubeScratch(layout: TubeLayout): TubeScratch {
  const cells = layout.cells;
  return {
    work: createBedWork(cells),
    probe: createBedWork(cells),
    tangent: createBedTangent(cells),
    propagation: createPropagation(cells),
    flowColumn: new Float64Array(cells),
    transferColumn: new Float64Array(cells),
    leakColumn: new Float64Array(cells),
    slope: new Float64Array(cells),
    temperature: new Float64Array(cells),
    gain: new Float64Array(layout.size),
    projections: Array.from({ length: layout.sensors }, () => new Float64Array(layout.size)),
  };
}

/** Conditions of a tube over one scan. */
export interface TubeDrive {
  /** Metered mean mass flux of the bed [kg/m2s], + = charge. */
  readonly massFlux_kg_m2s: number;
  /** Measured or assumed temperature of the entering gas [K]. */
  readonly inlet_K: number;
  /** Extra white uncertainty of that temperature [K], 0 where it is measured. */
  readonly inletSigma_K: number;
  readonly ambient_K: number;
  readonly dt_s: number;
  /** Unknown travel of the front in this scan [m], one sigma, in line with that of earlier scans. */
  readonly travelSigma_m: number;
  /** While standing: gas temperatures at both ends, which a leak would carry in [K]; NaN = unknown. */
  readonly standing_K?: Readonly<Record<'charge_inlet' | 'discharge_inlet', number>>;
}

/** Step of the leak's column, as a share of its sigma. */
const LEAK_PROBE = 0.1;

/** Sigma of the mass flux that leaks through a tube while standing, before any reading [kg/m2s]. */
export function leakSigma(model: TubeModel): number {
  return (model.estimator.leak_sigma_kg_s ?? 0) / model.tables.bed.area_m2;
}

/** What leaks through a tube in this scan [kg/m2s]: nothing while gas is driven through it. */
export function leakOf(model: TubeModel, state: TubeState, drive: TubeDrive): number {
  if (drive.massFlux_kg_m2s !== 0 || leakSigma(model) === 0) return 0;
  return state.further[model.layout.leak - model.layout.cells] as number;
}

/** What drives the bed of a tube in a scan: metered flow with its factor, or a leak while standing. */
export function tubeStep(
  model: TubeModel,
  state: TubeState,
  drive: TubeDrive,
): BedStep & { readonly end: 'charge_inlet' | 'discharge_inlet' } {
  const { layout, tables } = model;
  const at = (index: number): number => state.further[index - layout.cells] as number;
  const standing = drive.massFlux_kg_m2s === 0;
  const flux = standing
    ? leakOf(model, state, drive)
    : drive.massFlux_kg_m2s * Math.exp(at(layout.flow));
  const end = flux >= 0 ? 'charge_inlet' : 'discharge_inlet';
  const known = standing ? (drive.standing_K?.[end] ?? Number.NaN) : drive.inlet_K;
  // What leaks in unmeasured has stood beside the bed's end.
  const beside = state.enthalpy[flux >= 0 ? 0 : layout.cells - 1] as number;
  return {
    end,
    massFlux_kg_m2s: flux,
    inlet_K: Number.isFinite(known) ? known + at(layout.inlet[end]) : temperatureAt(tables, beside),
    ambient_K: drive.ambient_K,
    dt_s: drive.dt_s,
    heatTransferFactor: Math.exp(at(layout.transfer)),
    wallLoss_W_m3K: model.wallLoss_W_m3K,
  };
}

/** Moves a tube over one scan: its mean by the bed model, its covariance by the model's tangent. */
export function predictTube(
  model: TubeModel,
  state: TubeState,
  drive: TubeDrive,
  scratch: TubeScratch,
): void {
  const { layout, tables } = model;
  const { end, ...whole } = tubeStep(model, state, drive);
  const standing = drive.massFlux_kg_m2s === 0;
  const flowing = !standing;
  const leaks = standing && leakSigma(model) > 0;
  const probe = LEAK_PROBE * leakSigma(model);
  const substeps = planSubsteps(tables, layout.cells, whole);
  const step: BedStep = { ...whole, dt_s: whole.dt_s / substeps };
  const { work, tangent } = scratch;
  let gasOut = 0;
  for (let n = 0; n < substeps; n++) {
    if (leaks) {
      const flux = step.massFlux_kg_m2s + (step.massFlux_kg_m2s >= 0 ? probe : -probe);
      probeColumn(
        tables,
        state.enthalpy,
        { ...step, massFlux_kg_m2s: flux },
        scratch,
        scratch.leakColumn,
      );
    }
    bedSubstep(tables, state.enthalpy, step, work);
    gasOut += work.outlet_K;
    if (flowing) {
      const { flowColumn, transferColumn } = scratch;
      parameterColumns(tables, state.enthalpy, step, work, flowColumn, transferColumn);
    } else if (leaks) {
      const sign = step.massFlux_kg_m2s >= 0 ? 1 : -1;
      finishColumn(tables, state.enthalpy, scratch.leakColumn, sign * probe);
    }
    linearise(tables, state.enthalpy, step, work, tangent);
    const rows = {
      inlet: layout.inlet[end],
      parameters: flowing
        ? [
            { row: layout.flow, column: scratch.flowColumn },
            { row: layout.transfer, column: scratch.transferColumn },
          ]
        : leaks
          ? [{ row: layout.leak, column: scratch.leakColumn }]
          : [],
    };
    propagate(tangent, state.covariance, layout.size, rows, scratch.propagation);
    addProcessNoise(model, state, { ...drive, dt_s: step.dt_s, scans: 1 / substeps }, scratch);
  }
  state.outlet_K = standing ? Number.NaN : gasOut / substeps;
  const sign = Math.sign(drive.massFlux_kg_m2s);
  loosenPositions(model, state, work.gasLag_m, sign);
  for (let i = 0; i < layout.cells; i++) state.gasLag_m[i] = sign * (work.gasLag_m[i] as number);
  // The two cells at the middle, so that a bed turned end for end has the same.
  const films = work.filmSlope;
  const [below, above] = [(layout.cells - 1) >> 1, layout.cells >> 1];
  const filmSlope = ((films[below] as number) + (films[above] as number)) / 2;
  state.gas = {
    inlet_K: drive.inlet_K,
    inletSigma_K: drive.inletSigma_K,
    flow: state.further[layout.flow - layout.cells] as number,
    transfer: state.further[layout.transfer - layout.cells] as number,
    flowSlope: flowing ? 1 - filmSlope : 0,
  };
}

/** Puts H' of the perturbed step into the column; `finishColumn` makes the difference quotient. */
function probeColumn(
  tables: BedTables,
  enthalpy: Float64Array,
  probed: BedStep,
  scratch: TubeScratch,
  column: Float64Array,
): void {
  column.set(enthalpy);
  bedSubstep(tables, column, probed, scratch.probe);
}

function finishColumn(
  tables: BedTables,
  enthalpy: Float64Array,
  column: Float64Array,
  delta: number,
): void {
  for (let i = 0; i < column.length; i++) {
    // Divided by the heat capacity of the unperturbed cell: exact within a table segment.
    const h = enthalpy[i] as number;
    const dT = temperatureAt(tables, column[i] as number) - temperatureAt(tables, h);
    column[i] = dT / delta;
  }
}

/** Temperatures of the cells [K] into `out`. */
export function tubeTemperatures(
  model: TubeModel,
  state: TubeState,
  out: Float64Array,
): Float64Array {
  for (let i = 0; i < out.length; i++) {
    out[i] = temperatureAt(model.tables, state.enthalpy[i] as number);
  }
  return out;
}

/** Sets the cells of a tube to given temperatures [K]. */
export function setTubeTemperatures(
  model: TubeModel,
  state: TubeState,
  temperature_K: Float64Array,
): void {
  for (let i = 0; i < temperature_K.length; i++) {
    state.enthalpy[i] = enthalpyAt(model.tables, temperature_K[i] as number);
  }
}
