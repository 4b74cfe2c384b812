import { BedConstants, type BedParameters } from './bedParameters.js';
import { conductPart } from './conduct.js';
import { march, relaxShells } from './march.js';

export type { BedParameters } from './bedParameters.js';

const STATE = [
  'enthalpy',
  'temperature',
  'mean',
  'gas',
  'surface',
  'wall',
  'ends',
  'ringFlow',
] as const;

/**
 * Packed bed as concentric rings with N cells along the flow, each cell with gas, a film, S
 * particle shells of equal volume, conduction along and across, a vessel wall and a steel node at
 * each end. What is exchanged is carried as enthalpy, so energy closes to round-off.
 */
export class Bed {
  /** Specific enthalpy [J/kg] and temperature [K] of shell s in cell i of ring r at ((r N)+i) S + s. */
  readonly enthalpy: Float64Array;
  readonly temperature: Float64Array;
  /** Per ring and cell: mean over the particle, gas and particle surface [K]. */
  readonly mean: Float64Array;
  readonly gas: Float64Array;
  readonly surface: Float64Array;
  readonly wall: Float64Array;
  /** End steel, charge inlet first [K]. */
  readonly ends: Float64Array;
  /** Share of the flow in each ring over its share of the area. */
  readonly ringFlow: Float64Array;
  /** Per ring and cell, scratch of the conduction step [J/m3]. */
  readonly heat: Float64Array;
  /** Scratch of the march: pivots and right-hand sides of the shells. */
  readonly scratch: Float64Array;
  heatTransferFactor = 1;
  /** On the loss coefficients of mantle and ends. */
  lossFactor = 1;
  /** Heat brought in by the gas and lost to ambient since the start [J]. */
  gasHeat_J = 0;
  lostHeat_J = 0;

  readonly p: BedParameters;

  constructor(
    readonly c: BedConstants,
    from?: Bed,
  ) {
    const { p } = c;
    this.p = p;
    const count = c.rings * p.cells;
    this.enthalpy = new Float64Array(count * p.shells);
    this.temperature = new Float64Array(count * p.shells);
    this.mean = new Float64Array(count);
    this.gas = new Float64Array(count);
    this.surface = new Float64Array(count);
    this.wall = new Float64Array(p.cells);
    this.ends = new Float64Array(2);
    this.ringFlow = new Float64Array(c.rings).fill(1);
    this.heat = new Float64Array(count);
    this.scratch = new Float64Array(2 * p.shells);
    if (from) {
      for (const key of STATE) this[key].set(from[key]);
      this.heatTransferFactor = from.heatTransferFactor;
      this.lossFactor = from.lossFactor;
      this.gasHeat_J = from.gasHeat_J;
      this.lostHeat_J = from.lostHeat_J;
    }
  }

  clone(): Bed {
    return new Bed(this.c, this);
  }

  /** Sets every ring to T(x), wall and ends to their neighbours. */
  fill(profile: (x_m: number) => number): void {
    const { cells, shells } = this.p;
    for (let i = 0; i < cells; i++) {
      const T = profile((i + 0.5) * this.c.cellLength_m);
      const h = this.c.rock.enthalpyAt(T);
      this.wall[i] = T;
      for (let k = i; k < this.mean.length; k += cells) {
        this.enthalpy.fill(h, k * shells, (k + 1) * shells);
        this.temperature.fill(T, k * shells, (k + 1) * shells);
        this.mean[k] = T;
        this.gas[k] = T;
        this.surface[k] = T;
      }
    }
    this.ends[0] = profile(0);
    this.ends[1] = profile(this.p.length_m);
  }

  /**
   * One step of `dt_s`. Flow is positive while charging. Returns the temperature of the gas that
   * leaves the store behind its end steel [K]; NaN without flow.
   */
  step(dt_s: number, flow_kg_s: number, inlet_K: number, ambient_K: number): number {
    let outlet = Number.NaN;
    if (flow_kg_s !== 0) {
      const { fluid, rings } = this.c;
      const massFlow = Math.abs(flow_kg_s);
      const [inEnd, outEnd] = flow_kg_s > 0 ? [0, 1] : [1, 0];
      const entering = this.passEnd(inEnd, dt_s, massFlow, inlet_K);
      let mixed = 0;
      for (let r = 0; r < rings; r++) {
        const share = this.ringFlow[r]! * this.p.ring_shares[r]!;
        const flux = (massFlow / this.c.area_m2) * this.ringFlow[r]!;
        mixed += share * fluid.enthalpyAt(march(this, r, dt_s, flux, entering, flow_kg_s > 0));
      }
      outlet = this.passEnd(outEnd, dt_s, massFlow, fluid.temperatureAt(mixed));
      this.gasHeat_J += massFlow * dt_s * (fluid.enthalpyAt(inlet_K) - fluid.enthalpyAt(outlet));
    } else {
      relaxShells(this, dt_s);
    }
    this.conduct(dt_s, Math.abs(flow_kg_s), ambient_K);
    return outlet;
  }

  /** Gas past the steel of one end: trapezoidal in time, exact relaxation along the surface. */
  private passEnd(end: number, dt_s: number, massFlow: number, gas_K: number): number {
    const capacity = this.p.end_capacity_J_K[end]!;
    if (capacity === 0) return gas_K;
    const { fluid } = this.c;
    const g = massFlow * this.c.gasCapacity.at(gas_K);
    const exchange = this.p.end_exchange_W_K * (massFlow / 10) ** 0.6;
    const k = g * (1 - Math.exp(-exchange / g));
    const heat = (k * dt_s * (gas_K - this.ends[end]!)) / (1 + (0.5 * k * dt_s) / capacity);
    this.ends[end] = this.ends[end]! + heat / capacity;
    return fluid.temperatureAt(fluid.enthalpyAt(gas_K) - heat / (massFlow * dt_s));
  }

  /** Explicit conduction in as many parts as stability asks. */
  private conduct(dt_s: number, massFlow: number, ambient_K: number): void {
    const { p, c } = this;
    const stirred =
      p.stirring_factor * (massFlow / c.area_m2) * p.particle_diameter_m * c.gasCapacity.at(500);
    // Stable below 1/2; 250 J/kgK is less than any rock has above 100 K.
    const hottest = c.bedConductivity.at(900) + 0.5 * stirred;
    const stiffness = (2 * hottest) / (c.cellLength_m ** 2 * c.rockDensity * 250);
    const parts = Math.max(1, Math.ceil(dt_s * stiffness));
    for (let part = 0; part < parts; part++) conductPart(this, dt_s / parts, stirred, ambient_K);
  }

  /** Heat in rock, standing liquid, wall and end steel [J] above that at 70 K (rock) and 0 K (the rest). */
  totalHeat_J(): number {
    const { p, c } = this;
    let sum = this.bedHeat_J(0, 0);
    const wall = Math.PI * p.diameter_m * c.cellLength_m * p.wall_capacity_J_m2K;
    for (let i = 0; i < this.wall.length; i++) sum += wall * this.wall[i]!;
    for (let e = 0; e < 2; e++) sum += p.end_capacity_J_K[e]! * this.ends[e]!;
    return sum;
  }

  /** Heat of the bed (rock and standing liquid) above a uniform reference [J]. */
  heatAbove_J(reference_K: number): number {
    return this.bedHeat_J(this.c.rock.enthalpyAt(reference_K), reference_K);
  }

  private bedHeat_J(rockZero: number, fluidZero: number): number {
    const { c, p } = this;
    const perRing = p.cells * p.shells;
    let sum = 0;
    for (let r = 0; r < c.rings; r++) {
      let rock = 0;
      for (let j = r * perRing; j < (r + 1) * perRing; j++) rock += this.enthalpy[j]! - rockZero;
      let fluid = 0;
      for (let k = r * p.cells; k < (r + 1) * p.cells; k++) fluid += this.gas[k]! - fluidZero;
      const volume = c.ringArea_m2[r]! * c.cellLength_m;
      sum += volume * ((c.rockDensity / p.shells) * rock + c.fluidCapacity * fluid);
    }
    return sum;
  }

  /** Heat the bed holds between two uniform states [J]. */
  capacityBetween_J(low_K: number, high_K: number): number {
    const { c, p } = this;
    const rock = c.rockDensity * (c.rock.enthalpyAt(high_K) - c.rock.enthalpyAt(low_K));
    return c.area_m2 * p.length_m * (rock + c.fluidCapacity * (high_K - low_K));
  }
}

/** A bed from its parameters, to be filled before it is stepped. */
export function createBed(parameters: BedParameters): Bed {
  return new Bed(new BedConstants(parameters));
}
