import type { BedDefinition } from '../definitions.js';
import { stagnantConductivity } from './bedConductivity.js';
import { filmFlow, filmStill, particleResistance, surfacePerVolume } from './heatTransfer.js';

/**
 * Properties of one bed, tabulated over its volumetric enthalpy so that the time step needs no
 * transcendental property call. Within a segment T(H), e(H) are linear and the rest constant, which
 * makes the tabulated bed a consistent (piecewise) material of its own: enthalpy is conserved to
 * round-off and the tangent of the time step is exact almost everywhere.
 *
 * H [J/m3 of bed] = (1-eps) rho_s h_s(T) f_c (+ eps rho_f h_f(T) for a liquid), zero at the table's start.
 * e [J/kg]       = fluid enthalpy in equilibrium with the solid at that H.
 */
export interface BedTables {
  readonly bed: BedDefinition;
  readonly segments: number;
  /** Width of a segment [J/m3] and its inverse. */
  readonly dH: number;
  readonly inverse_dH: number;
  /** Nodes, length segments + 1: temperature [K] and fluid enthalpy [J/kg]. */
  readonly temperature_K: Float64Array;
  readonly fluidEnthalpy: Float64Array;
  /** Per segment: C = dH/dT [J/m3K], c_f = de/dT [J/kgK]. */
  readonly heatCapacity: Float64Array;
  readonly fluidHeatCapacity: Float64Array;
  /** Of all segments. */
  readonly greatestHeatCapacity_J_m3K: number;
  /**
   * Per segment, film coefficient h = filmStill + filmFlow G^0.6 [W/m2K] (Wakao & Kaguei 1982) and
   * particle resistance d/(10 k_s) [m2K/W] (h_eff = h/(1 + Bi/5), Jeffreson 1972).
   */
  readonly filmStill: Float64Array;
  readonly filmFlow: Float64Array;
  readonly particleResistance: Float64Array;
  /** Particle surface per bed volume 6(1-eps)/d [1/m], divided by (solid share)^2 for a liquid. */
  readonly surface_m2_m3: number;
  /** Per segment: stagnant axial conductivity [W/mK]. */
  readonly stagnant: Float64Array;
  /** Mixing along the flow over G cf d, 0.5 by Wakao & Kaguei 1982. */
  readonly mixing: number;
}

const DEFAULT_SEGMENTS = 768;

/**
 * Tabulates a bed between two temperatures (extended by 10 % of the span on both sides; beyond,
 * the end segments continue linearly).
 *
 * A liquid's heat content is counted with the solid's (one store of heat), and its transfer
 * coefficient is divided by the square of the solid's share, which gives the two-phase front its
 * dispersion D = (solid share)^2 (G cf)^2/(hv C) (long-time limit of the two-phase equations).
 *
 * @throws RangeError for a range that is not ascending or finite.
 */
export function buildBedTables(
  bed: BedDefinition,
  low_K: number,
  high_K: number,
  { segments = DEFAULT_SEGMENTS, mixing = 0.5 }: { segments?: number; mixing?: number } = {},
): BedTables {
  if (!(Number.isFinite(low_K) && Number.isFinite(high_K) && high_K > low_K && low_K > 0)) {
    throw new RangeError(`range [${low_K}, ${high_K}] K: expected 0 < low < high`);
  }
  const margin = 0.1 * (high_K - low_K);
  const from = Math.max(20, low_K - margin);
  const to = high_K + margin;
  const enthalpyAt = bedEnthalpyFunction(bed);
  const base = enthalpyAt(from);
  const dH = (enthalpyAt(to) - base) / segments;

  const temperature_K = new Float64Array(segments + 1);
  const fluidEnthalpy = new Float64Array(segments + 1);
  let guess = from;
  for (let node = 0; node <= segments; node++) {
    guess = invert(enthalpyAt, base + node * dH, guess, from - 1, to + 1);
    temperature_K[node] = guess;
    fluidEnthalpy[node] = bed.fluid.enthalpy(guess);
  }

  const heatCapacity = new Float64Array(segments);
  for (let s = 0; s < segments; s++) {
    heatCapacity[s] = dH / ((temperature_K[s + 1] as number) - (temperature_K[s] as number));
  }
  const solidShare = liquidSolidShare(bed, (low_K + high_K) / 2);
  const tables: BedTables = {
    bed,
    segments,
    dH,
    inverse_dH: 1 / dH,
    temperature_K,
    fluidEnthalpy,
    heatCapacity,
    fluidHeatCapacity: new Float64Array(segments),
    greatestHeatCapacity_J_m3K: Math.max(...heatCapacity),
    filmStill: new Float64Array(segments),
    filmFlow: new Float64Array(segments),
    particleResistance: new Float64Array(segments),
    surface_m2_m3: surfacePerVolume(bed) / (solidShare * solidShare),
    stagnant: new Float64Array(segments),
    mixing,
  };
  for (let s = 0; s < segments; s++) {
    const t0 = temperature_K[s] as number;
    const t1 = temperature_K[s + 1] as number;
    const t = 0.5 * (t0 + t1);
    tables.fluidHeatCapacity[s] =
      ((fluidEnthalpy[s + 1] as number) - (fluidEnthalpy[s] as number)) / (t1 - t0);
    tables.filmStill[s] = filmStill(bed, t);
    tables.filmFlow[s] = filmFlow(bed, t);
    tables.particleResistance[s] = particleResistance(bed, t);
    tables.stagnant[s] = bed.conductivity_factor * stagnantConductivity(bed, t);
  }
  return tables;
}

/** Volumetric enthalpy H(T) [J/m3 of bed] of solid, and liquid if any, with an arbitrary zero. */
export function bedEnthalpyFunction(bed: BedDefinition): (temperature_K: number) => number {
  const solid = (1 - bed.void_fraction) * bed.solid.density_kg_m3 * bed.heat_capacity_factor;
  if (bed.fluid.phase === 'gas') return (t) => solid * bed.solid.enthalpy(t);
  return (t) =>
    solid * bed.solid.enthalpy(t) +
    bed.void_fraction * bed.fluid.density_kg_m3(t, bed.pressure_Pa) * bed.fluid.enthalpy(t);
}

/** Share of the solid in the heat capacity of bed and liquid; 1 for a gas. */
export function liquidSolidShare(bed: BedDefinition, temperature_K: number): number {
  if (bed.fluid.phase === 'gas') return 1;
  const solid =
    (1 - bed.void_fraction) *
    bed.solid.density_kg_m3 *
    bed.heat_capacity_factor *
    bed.solid.heatCapacity(temperature_K);
  const liquid =
    bed.void_fraction *
    bed.fluid.density_kg_m3(temperature_K, bed.pressure_Pa) *
    bed.fluid.heatCapacity(temperature_K);
  return solid / (solid + liquid);
}

/** Temperature [K] at a volumetric enthalpy [J/m3]; beyond the table the end segment continues. */
export function temperatureAt(tables: BedTables, enthalpy_J_m3: number): number {
  const s = segmentOf(tables, enthalpy_J_m3);
  const fraction = enthalpy_J_m3 * tables.inverse_dH - s;
  const t0 = tables.temperature_K[s] as number;
  return t0 + fraction * ((tables.temperature_K[s + 1] as number) - t0);
}

/** Volumetric enthalpy [J/m3] at a temperature [K]; the exact inverse of `temperatureAt`. */
export function enthalpyAt(tables: BedTables, temperature_K: number): number {
  const nodes = tables.temperature_K;
  const s = bracket(nodes, temperature_K);
  const t0 = nodes[s] as number;
  return tables.dH * (s + (temperature_K - t0) / ((nodes[s + 1] as number) - t0));
}

/** The same, searched from the segment of an enthalpy nearby. */
export function enthalpyNear(
  tables: BedTables,
  temperature_K: number,
  nearby_J_m3: number,
): number {
  const nodes = tables.temperature_K;
  const last = tables.segments - 1;
  let s = segmentOf(tables, nearby_J_m3);
  while (s < last && temperature_K >= (nodes[s + 1] as number)) s++;
  while (s > 0 && temperature_K < (nodes[s] as number)) s--;
  const t0 = nodes[s] as number;
  return tables.dH * (s + (temperature_K - t0) / ((nodes[s + 1] as number) - t0));
}

/** Fluid enthalpy [J/kg] at a fluid temperature [K], consistent with the tables. */
export function fluidEnthalpyAt(tables: BedTables, temperature_K: number): number {
  const s = bracket(tables.temperature_K, temperature_K);
  return (
    (tables.fluidEnthalpy[s] as number) +
    (tables.fluidHeatCapacity[s] as number) * (temperature_K - (tables.temperature_K[s] as number))
  );
}

/** Fluid temperature [K] at a fluid enthalpy [J/kg]; the inverse of `fluidEnthalpyAt`. */
export function fluidTemperatureAt(tables: BedTables, enthalpy_J_kg: number): number {
  const s = bracket(tables.fluidEnthalpy, enthalpy_J_kg);
  return (
    (tables.temperature_K[s] as number) +
    (enthalpy_J_kg - (tables.fluidEnthalpy[s] as number)) / (tables.fluidHeatCapacity[s] as number)
  );
}

/** Index of the segment that holds a volumetric enthalpy, clamped to the table. */
export function segmentOf(tables: BedTables, enthalpy_J_m3: number): number {
  const s = Math.floor(enthalpy_J_m3 * tables.inverse_dH);
  return s < 0 ? 0 : s >= tables.segments ? tables.segments - 1 : s;
}

function bracket(nodes: Float64Array, value: number): number {
  let low = 0;
  let high = nodes.length - 1;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if ((nodes[middle] as number) <= value) low = middle;
    else high = middle;
  }
  return low;
}

/** Bisection-guarded secant for a monotone enthalpy function; stops at 1e-10 K. */
function invert(
  f: (t: number) => number,
  target: number,
  start: number,
  low: number,
  high: number,
): number {
  let a = low;
  let b = high;
  let t = start;
  for (let i = 0; i < 200; i++) {
    const value = f(t) - target;
    if (value > 0) b = t;
    else a = t;
    const slope = (f(t + 0.01) - f(t - 0.01)) / 0.02;
    let next = t - value / slope;
    if (!(next > a && next < b)) next = 0.5 * (a + b);
    if (Math.abs(next - t) < 1e-10) return next;
    t = next;
  }
  return t;
}
