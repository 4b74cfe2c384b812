import { stagnantConductivity } from '../../src/core/bed/bedConductivity.js';
import {
  filmCoefficient,
  particleResistance,
  surfacePerVolume,
} from '../../src/core/bed/heatTransfer.js';
import { bedEnthalpyFunction } from '../../src/core/bed/tables.js';
import type { StoreDefinition } from '../../src/core/definitions.js';
import type { PlantDraw } from '../../test/plant/draws.js';
import { fluidAt } from '../../test/plant/fluids.js';
import type { StoreGeometry } from '../../test/plant/geometry.js';
import { SOLIDS } from '../../test/plant/solids.js';
import { bedConductivity } from '../../test/plant/transfer.js';

/** ln of what of a store's draw the model's factors stand for; the share as it is. */
export interface PlantedStore {
  readonly transfer: number;
  readonly conductivity: number;
  readonly loss: number;
  readonly capacity: number;
  readonly share: number;
}

const POINTS = 9;

/**
 * The values that a perfect fit of our model would give for a store as drawn, by computation:
 *
 *   capacity      (1-eps) rho f (h(Th) - h(Tc)), theirs over ours
 *   transfer      a front spreads with G^2 cf^2 R, R = 1/hv. Theirs, film and inside of a piece in
 *                 series, the film alone times the factor drawn, and their stirring beyond 0.5:
 *                 R' = (1/(phi h) + d/(10 ks))/a' + 0.5 d (stirring - 1)/(G cf), a' = 6 (1-eps')/d;
 *                 ours R = (1/h + d/(10 ks))/a. phi = mean R/mean R' over the front's temperatures
 *   conductivity  mean k'/mean k, k of the standing bed over the same temperatures
 *   loss          as drawn
 *   share         a junction sees share g of gas and 1 - g of the surface, which is the share
 *                 rho = (d/(10 ks))/(1/(phi h) + d/(10 ks)) of the way from rock to gas, late by tau:
 *                 g + (1 - g) rho - tau hv/C, mean over thermocouples and temperatures
 *
 * @param flow_kg_s mean of |flow| while flowing, true
 */
export function plantedStore(
  store: StoreDefinition,
  geometry: StoreGeometry,
  draw: PlantDraw,
  flow_kg_s: number,
): PlantedStore {
  const { bed } = store;
  const own = draw.stores[store.id]!;
  const solid = SOLIDS[geometry.solid as string]!;
  const fluid = fluidAt(geometry.fluid, geometry.pressure_Pa);
  const low = store.reference_cold_K;
  const high = store.reference_hot_K;
  const enthalpy = bedEnthalpyFunction(bed);
  const density = solid.density_kg_m3 * (1 - own.void_fraction) * own.heat_capacity_factor;
  const steps = 2000;
  let theirs = 0;
  for (let i = 0; i < steps; i++) {
    theirs +=
      (density * solid.heatCapacity(low + ((i + 0.5) * (high - low)) / steps) * (high - low)) /
      steps;
  }
  const G = flow_kg_s / bed.area_m2;
  const d = bed.particle_diameter_m;
  const surface = (6 * (1 - own.void_fraction)) / d;
  const temperatures = Array.from(
    { length: POINTS },
    (_, i) => low + ((i + 0.5) * (high - low)) / POINTS,
  );
  let ours = 0;
  let spread = 0;
  let kOurs = 0;
  let kTheirs = 0;
  let gasOverSurface = 0;
  let perSecond = 0;
  for (const T of temperatures) {
    ours += (1 / filmCoefficient(bed, G, T) + particleResistance(bed, T)) / surfacePerVolume(bed);
    const kf = fluid.conductivity(T);
    const cf = fluid.heatCapacity(T);
    const mu = fluid.viscosity(T);
    const film = (kf / d) * (2 + 1.1 * Math.cbrt((mu * cf) / kf) * ((G * d) / mu) ** 0.6);
    const outer = 1 / (own.heat_transfer_factor * film);
    const inner = d / (10 * solid.conductivity(T));
    spread += (outer + inner) / surface + (0.5 * d * (own.stirring_factor - 1)) / (G * cf);
    gasOverSurface += inner / (outer + inner) / POINTS;
    perSecond += surface / (outer + inner) / (density * solid.heatCapacity(T)) / POINTS;
    kOurs += stagnantConductivity(bed, T);
    kTheirs +=
      own.conductivity_factor *
      bedConductivity(
        T,
        kf,
        solid.conductivity(T),
        d,
        own.void_fraction,
        solid.emissivity,
        geometry.particle_shape,
      );
  }
  const junctions = store.strings.flatMap((s) =>
    s.thermocouples.map((t) => draw.thermocouples[t.id]!),
  );
  const share = junctions.reduce(
    (sum, { gas_share: g, lag_s }) => sum + g + (1 - g) * gasOverSurface - lag_s * perSecond,
    0,
  );
  return {
    transfer: Math.log(ours / spread),
    conductivity: Math.log(kTheirs / kOurs),
    loss: Math.log(own.loss_factor),
    capacity: Math.log(theirs / (enthalpy(high) - enthalpy(low))),
    share: share / junctions.length,
  };
}
