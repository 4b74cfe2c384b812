import { bedSubstep, createBedWork, planSubsteps } from '../bed/kernel.js';
import { temperatureAt } from '../bed/tables.js';
import type { TubeDrive, TubeModel, TubeState } from './tube.js';

/** Cells that the front moves by from one candidate to the next. */
export const STEP_CELLS = 0.5;
/** A flow of which nothing is known takes the front through the bed in so long [s]: half a cycle. */
const THROUGH_S = 6 * 3600;
/** After so many lengths of the bed even a wide front is swept out. */
const SWEPT_LENGTHS = 1.5;
/** What a front that also went there and back, or stood, may be wider by [m]. */
const WIDER_M = [0, 0.25, 0.5, 1];
/** Rock at an end this near to its reference was left so by the gas; else that is a guess. */
const ENTERED_SHARE = 0.25;

/** A profile that a tube may have by now [K], and the way that its front has gone there [cells], + = charge. */
export interface Past {
  readonly profile: Float64Array;
  readonly moved_cells: number;
}

/**
 * What a tube may have become unseen: as it is, after a charge or a discharge of any length, by the bed
 * model with the heat transfer that is known and with one two sigmas better, and each of these with a
 * front that has widened more.
 *
 * @param drive of the scan: gas that enters now, and its flow
 */
export function pastsOf(model: TubeModel, state: TubeState, drive: TubeDrive): Iterable<Past> {
  const { layout, tables } = model;
  const sigma = Math.sqrt(state.covariance[layout.transfer * (layout.size + 1)] as number);
  const transfer = state.further[layout.transfer - layout.cells] as number;
  const path = [transfer, transfer + 2 * sigma].flatMap((ln) =>
    pathOf(model, state, drive, Math.exp(ln)),
  );
  return widened(path, tables.bed.length_m / layout.cells);
}

/** The bed as it is, and after a charge and a discharge of growing length from there. */
function pathOf(
  model: TubeModel,
  state: TubeState,
  drive: TubeDrive,
  heatTransferFactor: number,
): Past[] {
  const { tables, layout, store } = model;
  const { cells } = layout;
  const { reference_hot_K: hot, reference_cold_K: cold } = store;
  const segment = tables.segments >> 1;
  const dx = tables.bed.length_m / cells;
  // Way of a front per mass of gas [m per kg/m2].
  const way =
    (tables.fluidHeatCapacity[segment] as number) / (tables.heatCapacity[segment] as number);
  const driven = Math.abs(drive.massFlux_kg_m2s);
  const flux = driven > 0 ? driven : tables.bed.length_m / way / THROUGH_S;
  const work = createBedWork(cells);
  const temperatures = (enthalpy: Float64Array): Float64Array =>
    enthalpy.map((h) => temperatureAt(tables, h));
  const path: Past[] = [{ profile: temperatures(state.enthalpy), moved_cells: 0 }];
  for (const direction of [1, -1]) {
    const enthalpy = state.enthalpy.slice();
    const charged = store.kind === 'hot' ? hot : cold;
    const reference = direction > 0 ? charged : hot + cold - charged;
    const end = temperatureAt(tables, enthalpy[direction > 0 ? 0 : cells - 1] as number);
    const swept = Math.abs(end - reference) < ENTERED_SHARE * Math.abs(hot - cold);
    const measured = direction * drive.massFlux_kg_m2s > 0 && drive.inletSigma_K === 0;
    const whole = {
      massFlux_kg_m2s: direction * flux,
      inlet_K: measured ? drive.inlet_K : swept ? end : reference,
      ambient_K: drive.ambient_K,
      dt_s: (STEP_CELLS * dx) / way / flux,
      heatTransferFactor,
      wallLoss_W_m3K: model.wallLoss_W_m3K,
    };
    const substeps = planSubsteps(tables, cells, whole);
    const step = { ...whole, dt_s: whole.dt_s / substeps };
    for (let moved = 0; moved < SWEPT_LENGTHS * cells; moved += STEP_CELLS) {
      for (let n = 0; n < substeps; n++) bedSubstep(tables, enthalpy, step, work);
      path.push({ profile: temperatures(enthalpy), moved_cells: direction * (moved + STEP_CELLS) });
    }
  }
  return path;
}

/** Each profile as it is, and smoothed along the bed as a front that has widened more. */
function* widened(path: readonly Past[], dx: number): Generator<Past> {
  for (const wider_m of WIDER_M) {
    const reach = Math.ceil((3 * wider_m) / dx);
    const kernel = Array.from({ length: 2 * reach + 1 }, (_, k) =>
      Math.exp(-0.5 * (((k - reach) * dx) / Math.max(wider_m, dx / 10)) ** 2),
    );
    const sum = kernel.reduce((a, b) => a + b, 0);
    for (const { profile, moved_cells } of path) {
      const last = profile.length - 1;
      const smooth = profile.map((_, i) =>
        kernel.reduce(
          (total, w, k) =>
            total + (w / sum) * (profile[Math.min(last, Math.max(0, i + k - reach))] as number),
          0,
        ),
      );
      yield { profile: smooth, moved_cells };
    }
  }
}
