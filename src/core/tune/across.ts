import type { BedTables } from '../bed/tables.js';
import { segmentOf } from '../bed/tables.js';
import type { Rings } from './rings.js';

/** Contact and radiation between rock and wall [W/m2K], as in the tracker's wall zone. */
const CONTACT_W_M2K = 10;
/** Mixing across over G cf d (Wakao & Kaguei 1982: 0.1 Re Pr k_f). */
const MIXING = 0.1;

/** Heat across the bed during a step, and what it needs. */
export interface Across {
  /** Bed's own wall: heat capacity [J/m2K], loss coefficient [W/m2K]. */
  readonly steel_J_m2K: number;
  readonly loss_W_m2K: number;
  readonly ambient_K: number;
  /** Mean |G| [kg/m2s]. */
  readonly massFlux_kg_m2s: number;
  readonly dt_s: number;
}

/**
 * Conduction between rings, and from the outermost through the wall's steel to ambient, explicit in
 * the rings (days against the step), exact in the steel:
 *
 *   q = k (T_r+1 - T_r)/(middle distance) per area of the edge,   k = k_bed(T) + 0.1 G cf d
 *   steel:  C_w dTw/dt = h (T - Tw) - U (Tw - Tamb),   1/h = 1/10 + (distance to the wall)/k
 *
 * @param tables of each ring
 * @param enthalpy of each ring's cells [J/m3], changed in place
 * @param temperature of each ring's cells [K], as of `enthalpy`
 * @param steel_K of the wall beside each cell, changed in place
 */
export function conductAcross(
  rings: Rings,
  tables: readonly BedTables[],
  enthalpy: readonly Float64Array[],
  temperature: readonly Float64Array[],
  steel_K: Float64Array,
  step: Across,
): void {
  const last = enthalpy.length - 1;
  const radius = rings.edge_m[last] as number;
  const base = tables[0] as BedTables;
  const middle = base.segments >> 1;
  const cf = base.fluidHeatCapacity[middle] as number;
  const mixing = MIXING * step.massFlux_kg_m2s * base.bed.particle_diameter_m * cf;
  const dt = step.dt_s;
  const cells = steel_K.length;
  for (let r = 0; r < last; r++) {
    const table = tables[r] as BedTables;
    const H = enthalpy[r] as Float64Array;
    const T = temperature[r] as Float64Array;
    const next = enthalpy[r + 1] as Float64Array;
    const Tnext = temperature[r + 1] as Float64Array;
    const edge = rings.edge_m[r] as number;
    const span = (rings.middle_m[r + 1] as number) - (rings.middle_m[r] as number);
    const f = (2 * edge * dt) / (span * radius * radius);
    const own = f / (rings.share[r] as number);
    const other = f / (rings.share[r + 1] as number);
    for (let i = 0; i < cells; i++) {
      const k = (table.stagnant[segmentOf(table, H[i] as number)] as number) + mixing;
      const q = k * ((Tnext[i] as number) - (T[i] as number));
      H[i] = (H[i] as number) + own * q;
      next[i] = (next[i] as number) - other * q;
    }
  }
  const table = tables[last] as BedTables;
  const H = enthalpy[last] as Float64Array;
  const T = temperature[last] as Float64Array;
  const toWall = radius - (rings.middle_m[last] as number);
  // Mantle area per volume of the outermost ring.
  const perVolume = 2 / (radius * (rings.share[last] as number));
  for (let i = 0; i < cells; i++) {
    const k = (table.stagnant[segmentOf(table, H[i] as number)] as number) + mixing;
    const h = 1 / (1 / CONTACT_W_M2K + toWall / k);
    const u = step.loss_W_m2K;
    const t = T[i] as number;
    const was = steel_K[i] as number;
    const settled = (h * t + u * step.ambient_K) / (h + u);
    const c = step.steel_J_m2K;
    const rate = c > 0 ? ((h + u) * dt) / c : Number.POSITIVE_INFINITY;
    const now = settled + (was - settled) * Math.exp(-rate);
    // Mean over the step of the exact course; without steel it is settled throughout.
    const mean = c > 0 ? settled + ((was - settled) * (1 - Math.exp(-rate))) / rate : settled;
    steel_K[i] = now;
    H[i] = (H[i] as number) - perVolume * h * dt * (t - mean);
  }
}
