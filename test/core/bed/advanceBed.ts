import { type BedStep, createBedWork, stepBed } from '../../../src/core/bed/kernel.js';
import { type BedTables, enthalpyAt, temperatureAt } from '../../../src/core/bed/tables.js';

/** A uniform bed [J/m3]. */
export function uniformBed(tables: BedTables, cells: number, temperature_K: number): Float64Array {
  return new Float64Array(cells).fill(enthalpyAt(tables, temperature_K));
}

/** A step without losses at the configured transfer. */
export function plainStep(over: Partial<BedStep>): BedStep {
  return {
    massFlux_kg_m2s: 0.3,
    inlet_K: 600,
    ambient_K: 300,
    dt_s: 60,
    heatTransferFactor: 1,
    wallLoss_W_m3K: 0,
    ...over,
  };
}

/** Runs a bed for a time in equal steps; returns its temperatures [K]. */
export function runBed(
  tables: BedTables,
  bed: Float64Array,
  step: BedStep,
  time_s: number,
): Float64Array {
  const steps = Math.ceil(time_s / step.dt_s);
  const work = createBedWork(bed.length);
  for (let n = 0; n < steps; n++) stepBed(tables, bed, { ...step, dt_s: time_s / steps }, work);
  return bed.map((h) => temperatureAt(tables, h));
}

/** Mean and standard deviation [m] of the front of a rising or falling profile between two levels. */
export function frontMoments(
  temperature_K: Float64Array,
  inlet_K: number,
  start_K: number,
  dx: number,
): { mean_m: number; sigma_m: number } {
  // -dtheta/dx is the density of the front; its moments by summation over the cells.
  const theta = temperature_K.map((t) => (t - start_K) / (inlet_K - start_K));
  let mean = 0;
  let second = 0;
  for (let i = 0; i < theta.length; i++) {
    const x = (i + 0.5) * dx;
    mean += (theta[i] as number) * dx;
    second += 2 * x * (theta[i] as number) * dx;
  }
  return { mean_m: mean, sigma_m: Math.sqrt(second - mean * mean) };
}
