import type { BedDefinition, Fluid, Solid } from '../../../src/core/definitions.js';

/** A solid of constant properties, for cases with an exact solution. */
export function constantSolid(over: {
  density?: number;
  heatCapacity?: number;
  conductivity?: number;
  slope?: number;
}): Solid {
  const c = over.heatCapacity ?? 1000;
  const slope = over.slope ?? 0;
  const k = over.conductivity ?? 3;
  return {
    name: 'constant',
    source: 'test',
    range_K: [1, 3000],
    density_kg_m3: over.density ?? 2600,
    heatCapacity: (t) => c + slope * t,
    enthalpy: (t) => c * t + (slope * t * t) / 2,
    conductivity: () => k,
    emissivity: 0.9,
  };
}

/** A gas of constant properties. */
export function constantGas(over: { cp?: number; k?: number; mu?: number } = {}): Fluid {
  const cp = over.cp ?? 1000;
  return {
    name: 'constant gas',
    source: 'test',
    phase: 'gas',
    range_K: [1, 3000],
    gasConstant_J_kgK: 208,
    heatCapacity: () => cp,
    enthalpy: (t) => cp * t,
    viscosity_Pa_s: () => over.mu ?? 3e-5,
    conductivity: () => over.k ?? 0.04,
    density_kg_m3: (t, p) => p / (208 * t),
  };
}

/** A bed without losses. */
export function simpleBed(over: Partial<BedDefinition> = {}): BedDefinition {
  return {
    length_m: 2,
    area_m2: 1,
    diameter_m: 1.128,
    particle_diameter_m: 0.02,
    void_fraction: 0.4,
    solid: constantSolid({}),
    fluid: constantGas(),
    pressure_Pa: 1e5,
    particle_shape: 'crushed',
    heat_transfer_factor: 1,
    conductivity_factor: 1,
    pressure_drop_factor: 1,
    heat_capacity_factor: 1,
    loss_factor: 1,
    wall_loss_W_m2K: 0,
    end_loss_W_m2K: { charge_inlet: 0, discharge_inlet: 0 },
    end_capacity_J_K: { charge_inlet: 0, discharge_inlet: 0 },
    end_volume_m3: { charge_inlet: 0, discharge_inlet: 0 },
    ...over,
  };
}
