import type { BedStep, BedWork } from './kernel.js';
import { type BedTables, fluidEnthalpyAt, segmentOf } from './tables.js';

/**
 * Tangent of one substep of the bed with respect to the cell temperatures, the inlet temperature
 * and scalar parameters: the coefficients of
 *
 *   dT'_i = own_i dT_i + gas_i dE_i + right_i dT_{i+1} + left_i dT_{i-1} + sum_k column_k[i] dtheta_k
 *   dE_{i+1} = (1 - b_i) dE_i + bcf_i dT_i          along the flow, dE_0 = cf(inlet) dT_inlet
 *
 * so that applying it to a vector costs O(cells), not O(cells^2). Coefficients of conductivity and
 * exchange with temperature vanish within a table segment, so this is the exact derivative of the
 * tabulated bed almost everywhere.
 */
export interface BedTangent {
  readonly cells: number;
  forward: boolean;
  flowing: boolean;
  readonly own: Float64Array;
  readonly gas: Float64Array;
  readonly left: Float64Array;
  readonly right: Float64Array;
  /** b_i and b_i cf_i. */
  readonly pickup: Float64Array;
  readonly pickupHeat: Float64Array;
  /** cf of the gas at the inlet [J/kgK]. */
  inletHeatCapacity: number;
}

export function createBedTangent(cells: number): BedTangent {
  return {
    cells,
    forward: true,
    flowing: false,
    own: new Float64Array(cells),
    gas: new Float64Array(cells),
    left: new Float64Array(cells),
    right: new Float64Array(cells),
    pickup: new Float64Array(cells),
    pickupHeat: new Float64Array(cells),
    inletHeatCapacity: 0,
  };
}

/**
 * Fills `tangent` for the substep that `work` describes; `enthalpy` is the bed after it.
 */
export function linearise(
  tables: BedTables,
  enthalpy: Float64Array,
  step: BedStep,
  work: BedWork,
  tangent: BedTangent,
): void {
  const cells = work.cells;
  const bed = tables.bed;
  const dx = bed.length_m / cells;
  const flux = Math.abs(step.massFlux_kg_m2s);
  const transfer = (flux * step.dt_s) / dx;
  const factor = step.dt_s / (dx * dx);
  tangent.flowing = flux > 0;
  tangent.forward = step.massFlux_kg_m2s >= 0;
  if (flux > 0) {
    const e0 = fluidEnthalpyAt(tables, step.inlet_K);
    tangent.inletHeatCapacity = fluidEnthalpyAt(tables, step.inlet_K + 0.5) * 2 - e0 * 2;
  }
  for (let i = 0; i < cells; i++) {
    const old = work.heatCapacity[i] as number;
    const inverse = 1 / (tables.heatCapacity[segmentOf(tables, enthalpy[i] as number)] as number);
    const k = work.conductivity[i] as number;
    const kRight = i + 1 < cells ? 0.5 * factor * (k + (work.conductivity[i + 1] as number)) : 0;
    const kLeft = i > 0 ? 0.5 * factor * (k + (work.conductivity[i - 1] as number)) : 0;
    let loss = step.wallLoss_W_m3K * step.dt_s;
    if (i === 0) loss += (bed.end_loss_W_m2K.charge_inlet * bed.loss_factor * step.dt_s) / dx;
    if (i === cells - 1) {
      loss += (bed.end_loss_W_m2K.discharge_inlet * bed.loss_factor * step.dt_s) / dx;
    }
    const b = work.pickup[i] as number;
    const bcf = flux > 0 ? b * (work.fluidHeatCapacity[i] as number) : 0;
    tangent.pickup[i] = b;
    tangent.pickupHeat[i] = bcf;
    tangent.own[i] = (old - kRight - kLeft - loss - transfer * bcf) * inverse;
    tangent.gas[i] = transfer * b * inverse;
    tangent.right[i] = kRight * inverse;
    tangent.left[i] = kLeft * inverse;
  }
}

/** Where the parameters of a tangent stand among the rows of a matrix. */
export interface TangentRows {
  /** Row of the inlet temperature's offset, or -1. */
  readonly inlet: number;
  /** Rows of the scalar parameters and their columns dT'/dtheta (length cells). */
  readonly parameters: readonly { readonly row: number; readonly column: Float64Array }[];
}

/** dT'/dparameter of a vector form, for tests: applies the tangent to one vector in place. */
export function applyTangentToVector(
  tangent: BedTangent,
  vector: Float64Array,
  inlet: number,
): void {
  const { cells, forward } = tangent;
  const old = Float64Array.from(vector);
  let e = tangent.flowing ? tangent.inletHeatCapacity * inlet : 0;
  for (let n = 0; n < cells; n++) {
    const i = forward ? n : cells - 1 - n;
    const t = old[i] as number;
    vector[i] =
      (tangent.own[i] as number) * t +
      (tangent.gas[i] as number) * e +
      (tangent.left[i] as number) * (i > 0 ? (old[i - 1] as number) : 0) +
      (tangent.right[i] as number) * (i + 1 < cells ? (old[i + 1] as number) : 0);
    e = (1 - (tangent.pickup[i] as number)) * e + (tangent.pickupHeat[i] as number) * t;
  }
}

export const NO_ROWS: TangentRows = { inlet: -1, parameters: [] };
