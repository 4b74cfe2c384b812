import type { TruthFluid } from './fluids.js';
import { shellConductances } from './particle.js';
import { EnthalpyTable, type TruthSolid } from './solids.js';
import { bedConductivity, TemperatureTable } from './transfer.js';

/** Everything one simulated store is made of; SI units, kelvin; x = 0 at the charge inlet. */
export interface BedParameters {
  readonly length_m: number;
  readonly diameter_m: number;
  readonly particle_diameter_m: number;
  readonly void_fraction: number;
  readonly particle_shape: 'crushed' | 'sphere';
  readonly solid: TruthSolid;
  readonly fluid: TruthFluid;
  /** Share of the cross-section of each concentric ring, from the axis outwards; they sum to 1. */
  readonly ring_shares: readonly number[];
  readonly cells: number;
  readonly shells: number;
  readonly heat_capacity_factor: number;
  readonly conductivity_factor: number;
  /** Factor on the stirring by the flow (0.5 Re Pr kf along, 0.1 across). */
  readonly stirring_factor: number;
  /** Loss coefficients [W/m2K], mantle and the two ends (charge inlet first). */
  readonly wall_loss_W_m2K: number;
  readonly end_loss_W_m2K: readonly [number, number];
  /** Heat capacity of the vessel wall [J/m2K] and of each end's steel [J/K]. */
  readonly wall_capacity_J_m2K: number;
  readonly end_capacity_J_K: readonly [number, number];
  /** Exchange of gas and end steel at 10 kg/s [W/K]; grows with flow^0.6. */
  readonly end_exchange_W_K: number;
}

/** What follows from the parameters once: tables and geometry. Shared by a bed and its copies. */
export class BedConstants {
  readonly rings: number;
  readonly area_m2: number;
  readonly cellLength_m: number;
  readonly ringArea_m2: Float64Array;
  /** Outer and area-halving radius of each ring [m]. */
  readonly ringEdge_m: Float64Array;
  readonly ringMiddle_m: Float64Array;
  /** Rock per volume of bed [kg/m3], and heat capacity of standing liquid [J/m3K], 0 for a gas. */
  readonly rockDensity: number;
  readonly fluidCapacity: number;
  /** Conductances between particle shells and to the surface, per volume of bed and W/mK of rock. */
  readonly shellBetween: Float64Array;
  readonly shellSurface: number;
  readonly rock: EnthalpyTable;
  readonly fluid: EnthalpyTable;
  /** Film per volume of bed [W/m3K] = A(T) + G^0.6 B(T), Nu = 2 + 1.1 Pr^(1/3) Re^0.6 (Wakao & Kaguei 1982). */
  readonly filmA: TemperatureTable;
  readonly filmB: TemperatureTable;
  readonly gasCapacity: TemperatureTable;
  readonly rockConductivity: TemperatureTable;
  readonly bedConductivity: TemperatureTable;

  constructor(readonly p: BedParameters) {
    this.rings = p.ring_shares.length;
    this.area_m2 = (Math.PI / 4) * p.diameter_m ** 2;
    this.cellLength_m = p.length_m / p.cells;
    this.ringArea_m2 = Float64Array.from(p.ring_shares, (share) => share * this.area_m2);
    this.ringEdge_m = new Float64Array(this.rings);
    this.ringMiddle_m = new Float64Array(this.rings);
    let inside = 0;
    for (let r = 0; r < this.rings; r++) {
      const share = p.ring_shares[r]!;
      this.ringMiddle_m[r] = (p.diameter_m / 2) * Math.sqrt(inside + share / 2);
      inside += share;
      this.ringEdge_m[r] = (p.diameter_m / 2) * Math.sqrt(inside);
    }
    if (Math.abs(inside - 1) > 1e-9)
      throw new RangeError(`ring_shares must sum to 1, got ${inside}`);
    const solidShare = 1 - p.void_fraction;
    const { fluid, solid, particle_diameter_m: d } = p;
    this.rockDensity = solidShare * solid.density_kg_m3 * p.heat_capacity_factor;
    this.fluidCapacity = fluid.liquid
      ? p.void_fraction * fluid.density(500) * fluid.heatCapacity(500)
      : 0;
    this.rock = new EnthalpyTable(solid.heatCapacity);
    this.fluid = new EnthalpyTable(fluid.heatCapacity);
    const grains = solidShare / ((Math.PI / 6) * d ** 3);
    const shell = shellConductances(d, p.shells);
    this.shellBetween = shell.between.map((k) => k * grains);
    this.shellSurface = shell.surface * grains;
    const surfaceArea = (6 * solidShare) / d;
    this.filmA = new TemperatureTable((T) => (surfaceArea * 2 * fluid.conductivity(T)) / d);
    this.filmB = new TemperatureTable((T) => {
      const prandtl = (fluid.viscosity(T) * fluid.heatCapacity(T)) / fluid.conductivity(T);
      const reynoldsPart = (d / fluid.viscosity(T)) ** 0.6;
      return (surfaceArea * 1.1 * fluid.conductivity(T) * Math.cbrt(prandtl) * reynoldsPart) / d;
    });
    this.gasCapacity = new TemperatureTable(fluid.heatCapacity);
    this.rockConductivity = new TemperatureTable((T) => solid.conductivity(T));
    this.bedConductivity = new TemperatureTable(
      (T) =>
        p.conductivity_factor *
        bedConductivity(
          T,
          fluid.conductivity(T),
          solid.conductivity(T),
          d,
          p.void_fraction,
          solid.emissivity,
          p.particle_shape,
        ),
    );
  }
}
