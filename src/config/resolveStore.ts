import { fluidByName, gasAtPressure, liquidOf } from '../core/bed/fluids.js';
import { solidByName, solidFromPolynomial, solidFromTable } from '../core/bed/solids.js';
import type { Fluid, Solid, StoreDefinition } from '../core/definitions.js';
import { ZERO_CELSIUS_K } from '../core/units.js';
import { areaShares, expandString } from './expand.js';
import type { StoreBlock } from './schema/store.js';

/** @throws RangeError in words of the core where a block's own data are impossible. */
export function resolveSolid(block: StoreBlock['bed']['solid']): Solid {
  if (typeof block === 'string') return solidByName(block);
  const facts = {
    name: block.name,
    source: block.source,
    density_kg_m3: block.density_kg_m3,
    conductivity_W_mK: block.conductivity_W_mK,
    emissivity: block.emissivity,
    below: block.below_range,
  };
  if (block.given_as === 'table') {
    return solidFromTable({
      ...facts,
      temperatures_K: block.temperature_degC.map((t) => t + ZERO_CELSIUS_K),
      heatCapacities_J_kgK: block.heat_capacity_J_kgK,
    });
  }
  return solidFromPolynomial({
    ...facts,
    coefficients: block.coefficients,
    range_K: [block.valid_from_degC + ZERO_CELSIUS_K, block.valid_to_degC + ZERO_CELSIUS_K],
  });
}

export function resolveFluid(block: StoreBlock['bed']['fluid']): Fluid {
  if (typeof block === 'string') return fluidByName(block);
  return liquidOf({
    name: block.name,
    source: block.source,
    density_kg_m3: block.density_kg_m3,
    heat_capacity_J_kgK: block.heat_capacity_J_kgK,
    viscosity_Pa_s: block.viscosity_mPa_s * 1e-3,
    conductivity_W_mK: block.conductivity_W_mK,
  });
}

export function resolveStore(store: StoreBlock): StoreDefinition {
  const { bed, factors, losses, ends } = store;
  const shares = areaShares(store);
  return {
    id: store.id,
    kind: store.kind,
    charge_inlet_at: store.charge_inlet_at,
    bed: {
      length_m: bed.height_m,
      area_m2: (Math.PI / 4) * bed.diameter_m * bed.diameter_m,
      diameter_m: bed.diameter_m,
      particle_diameter_m: bed.particle_diameter_mm * 1e-3,
      void_fraction: bed.void_fraction,
      solid: resolveSolid(bed.solid),
      fluid:
        // A store's pressure is fixed, so its gas may be the real one at that pressure.
        typeof bed.fluid === 'string'
          ? gasAtPressure(bed.fluid, store.pressure_bar * 1e5)
          : resolveFluid(bed.fluid),
      pressure_Pa: store.pressure_bar * 1e5,
      particle_shape: bed.particle_shape,
      heat_transfer_factor: factors.heat_transfer,
      conductivity_factor: factors.conductivity,
      pressure_drop_factor: factors.pressure_drop,
      heat_capacity_factor: factors.heat_capacity,
      loss_factor: factors.loss,
      wall_loss_W_m2K: losses.wall_W_m2K,
      wall_capacity_J_m2K: losses.wall_steel_kJ_m2K * 1e3,
      end_loss_W_m2K: {
        charge_inlet: losses.charge_inlet_end_W_m2K,
        discharge_inlet: losses.discharge_inlet_end_W_m2K,
      },
      end_capacity_J_K: {
        charge_inlet: ends.charge_inlet_steel_kJ_K * 1e3,
        discharge_inlet: ends.discharge_inlet_steel_kJ_K * 1e3,
      },
      end_volume_m3: {
        charge_inlet: ends.charge_inlet_volume_m3,
        discharge_inlet: ends.discharge_inlet_volume_m3,
      },
    },
    ...(factors.gas_share === undefined ? {} : { gas_share: factors.gas_share }),
    reference_hot_K: store.reference_hot_degC + ZERO_CELSIUS_K,
    reference_cold_K: store.reference_cold_degC + ZERO_CELSIUS_K,
    strings: store.strings.map((string, s) => {
      // Topics do not matter here, so any prefix and unit will do.
      const { ids, x_m } = expandString('', store, string, '');
      return {
        id: string.id,
        radius_m: string.radius_m,
        area_share: shares[s]!,
        thermocouples: ids
          .map((id, i) => ({
            id,
            position_m: x_m[i]!,
            group: string.group ?? `${store.id}/${string.id}`,
          }))
          .sort((a, b) => a.position_m - b.position_m),
      };
    }),
  };
}
