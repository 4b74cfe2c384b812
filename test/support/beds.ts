import { fluidByName, liquidOf } from '../../src/core/bed/fluids.js';
import { solidFromPolynomial } from '../../src/core/bed/solids.js';
import type { BedDefinition } from '../../src/core/definitions.js';

/** Rock of constant heat capacity, as in the measured bed of Meier 1991. */
export const meierRock = solidFromPolynomial({
  name: 'rock of Meier 1991',
  source: 'Meier et al. 1991; emissivity: common practice',
  density_kg_m3: 2800,
  coefficients: [1030],
  range_K: [273.15, 900],
  conductivity_W_mK: 2.5,
  emissivity: 0.85,
});

/** Air at 773.15 K and 1 atm as in fixtures/gas_property_check_values_coolprop.csv, unrounded. */
export const handAir = liquidOf({
  name: 'air at 773.15 K, constant',
  density_kg_m3: 0.45639,
  heat_capacity_J_kgK: 1092.426,
  viscosity_Pa_s: 3.65305e-5,
  conductivity_W_mK: 0.0557953,
});

/** The bed of Meier 1991 with factors of 1 and no losses; tests override what they are about. */
export function bedOf(change: Partial<BedDefinition> = {}): BedDefinition {
  return {
    length_m: 1.2,
    area_m2: (Math.PI * 0.15 ** 2) / 4,
    diameter_m: 0.15,
    particle_diameter_m: 0.02,
    void_fraction: 0.4,
    solid: meierRock,
    fluid: fluidByName('air'),
    pressure_Pa: 101325,
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
    ...change,
  };
}
