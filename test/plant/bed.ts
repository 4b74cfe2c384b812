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
  readonly solid: TruthSolid;
  readonly fluid: TruthFluid;
  readonly pressure_Pa: number;
  readonly rings: number;
  readonly cells: number;
  readonly shells: number;
  readonly heat_capacity_factor: number;
  readonly conductivity_factor: number;
  /** Loss coefficients [W/m2K], mantle and the two ends (charge inlet first). */
  readonly wall_loss_W_m2K: number;
  readonly end_loss_W_m2K: readonly [number, number];
  /** Heat capacity of the vessel wall [J/m2K] and of each end's steel [J/K]. */
  readonly wall_capacity_J_m2K: number;
  readonly end_capacity_J_K: readonly [number, number];
  /** Exchange of gas and end steel at 10 kg/s [W/K]; grows with flow^0.6. */
  readonly end_exchange_W_K: number;
}

const WALL_EXCHANGE_W_M2K = 12;
const END_BED_EXCHANGE_W_M2K = 8;

/**
 * Packed bed as R concentric rings of equal area and N cells along the flow, each cell with gas,
 * a film, S particle shells of equal volume, conduction along and across, a vessel wall and a
 * steel node at each end.
 *
 * Along the flow the gas obeys g (Tin - Tout) = K (w Tout + (1-w) Tin - Tsurface), w = 1/2 (box
 * scheme, whose spreading per cell is exactly that of the film, g dx/(2K)... 2 D t with D = v/a)
 * and w = 1 - 1/n above n = K/g = 2, where it stays monotone. In time shells and gas advance
 * by the trapezoidal rule, cell after cell in the direction of the flow, with c(T) taken at the start of
 * the step; what is exchanged is carried as enthalpy, so energy closes to round-off.
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
  /** Share of the flow in each ring over its share of the area; the mean is 1. */
  readonly ringFlow: Float64Array;
  heatTransferFactor = 1;
  /** Heat brought in by the gas and lost to ambient since the start [J]. */
  gasHeat_J = 0;
  lostHeat_J = 0;

  readonly cellLength_m: number;
  readonly rockMass_kg: number;
  readonly table: EnthalpyTable;
  readonly fluidTable: EnthalpyTable;
  private readonly shellBetween: Float64Array;
  private readonly shellSurface: number;
  private readonly shellScratch: Float64Array;
  private readonly heat: Float64Array;
  private readonly outlets: Float64Array;
  private readonly transferA: TemperatureTable;
  private readonly transferB: TemperatureTable;
  private readonly rockConductivity: TemperatureTable;
  private readonly bedConductivity: TemperatureTable;
  /** Heat capacity of standing liquid per cell [J/K]; 0 for a gas. */
  private readonly fluidCapacity: number;

  constructor(
    readonly p: BedParameters,
    from?: Bed,
  ) {
    const count = p.rings * p.cells;
    this.cellLength_m = p.length_m / p.cells;
    const area = (Math.PI / 4) * p.diameter_m ** 2;
    const volume = (area / p.rings) * this.cellLength_m;
    this.rockMass_kg =
      volume * (1 - p.void_fraction) * p.solid.density_kg_m3 * p.heat_capacity_factor;
    this.fluidCapacity = p.fluid.liquid
      ? volume * p.void_fraction * p.fluid.density(500, p.pressure_Pa) * p.fluid.heatCapacity(500)
      : 0;
    this.enthalpy = new Float64Array(count * p.shells);
    this.temperature = new Float64Array(count * p.shells);
    this.mean = new Float64Array(count);
    this.gas = new Float64Array(count);
    this.surface = new Float64Array(count);
    this.wall = new Float64Array(p.cells);
    this.ends = new Float64Array(2);
    this.ringFlow = new Float64Array(p.rings).fill(1);
    this.shellScratch = new Float64Array(3 * p.shells);
    this.heat = new Float64Array(count);
    this.outlets = new Float64Array(p.rings);
    if (from) {
      this.table = from.table;
      this.fluidTable = from.fluidTable;
      this.shellBetween = from.shellBetween;
      this.shellSurface = from.shellSurface;
      this.transferA = from.transferA;
      this.transferB = from.transferB;
      this.rockConductivity = from.rockConductivity;
      this.bedConductivity = from.bedConductivity;
      for (const key of [
        'enthalpy',
        'temperature',
        'mean',
        'gas',
        'surface',
        'wall',
        'ends',
        'ringFlow',
      ] as const) {
        this[key].set(from[key]);
      }
      this.heatTransferFactor = from.heatTransferFactor;
      this.gasHeat_J = from.gasHeat_J;
      this.lostHeat_J = from.lostHeat_J;
      return;
    }
    this.table = new EnthalpyTable(p.solid.heatCapacity);
    this.fluidTable = new EnthalpyTable(p.fluid.heatCapacity);
    const grains = (volume * (1 - p.void_fraction)) / ((Math.PI / 6) * p.particle_diameter_m ** 3);
    const shell = shellConductances(p.particle_diameter_m, p.shells);
    this.shellBetween = shell.between.map((k) => k * grains);
    this.shellSurface = shell.surface * grains;
    // Film of a cell [W/K] = A(T) + G^0.6 B(T), from Nu = 2 + 1.1 Pr^(1/3) Re^0.6 (Wakao & Kaguei 1982).
    const d = p.particle_diameter_m;
    const surfaceArea = (6 * (1 - p.void_fraction) * volume) / d;
    const { fluid } = p;
    this.transferA = new TemperatureTable((T) => (surfaceArea * 2 * fluid.conductivity(T)) / d);
    this.transferB = new TemperatureTable((T) => {
      const prandtl = (fluid.viscosity(T) * fluid.heatCapacity(T)) / fluid.conductivity(T);
      return (
        (surfaceArea *
          1.1 *
          fluid.conductivity(T) *
          Math.cbrt(prandtl) *
          (d / fluid.viscosity(T)) ** 0.6) /
        d
      );
    });
    this.rockConductivity = new TemperatureTable((T) => p.solid.conductivity(T));
    this.bedConductivity = new TemperatureTable(
      (T) =>
        p.conductivity_factor *
        bedConductivity(
          T,
          fluid.conductivity(T),
          p.solid.conductivity(T),
          d,
          p.void_fraction,
          p.solid.emissivity,
        ),
    );
  }

  clone(): Bed {
    return new Bed(this.p, this);
  }

  /** Sets every ring to T(x) and wall and ends to their neighbours. */
  fill(profile: (x_m: number) => number): void {
    const { rings, cells, shells } = this.p;
    for (let r = 0; r < rings; r++) {
      for (let i = 0; i < cells; i++) {
        const T = profile((i + 0.5) * this.cellLength_m);
        const h = this.table.enthalpyAt(T);
        const k = r * cells + i;
        this.enthalpy.fill(h, k * shells, (k + 1) * shells);
        this.temperature.fill(T, k * shells, (k + 1) * shells);
        this.mean[k] = T;
        this.gas[k] = T;
        this.surface[k] = T;
        this.wall[i] = T;
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
      const massFlow = Math.abs(flow_kg_s);
      const [inEnd, outEnd] = flow_kg_s > 0 ? [0, 1] : [1, 0];
      const entering = this.passEnd(inEnd, dt_s, massFlow, inlet_K);
      let mixed = 0;
      for (let r = 0; r < this.p.rings; r++) {
        const ringFlow = (massFlow * this.ringFlow[r]!) / this.p.rings;
        this.outlets[r] = this.march(r, dt_s, ringFlow, entering, flow_kg_s > 0);
        mixed += (ringFlow / massFlow) * this.fluidTable.enthalpyAt(this.outlets[r]!);
      }
      outlet = this.passEnd(outEnd, dt_s, massFlow, this.fluidTable.temperatureAt(mixed));
      const h = this.fluidTable;
      this.gasHeat_J += massFlow * dt_s * (h.enthalpyAt(inlet_K) - h.enthalpyAt(outlet));
    } else {
      this.relaxShells(dt_s);
    }
    this.conduct(dt_s, Math.abs(flow_kg_s), ambient_K);
    return outlet;
  }

  /** Gas past the steel of one end: trapezoidal in time, exact relaxation along the surface. */
  private passEnd(end: number, dt_s: number, massFlow: number, gas_K: number): number {
    const capacity = this.p.end_capacity_J_K[end]!;
    if (capacity === 0) return gas_K;
    const g = massFlow * this.p.fluid.heatCapacity(gas_K);
    const exchange = this.p.end_exchange_W_K * (massFlow / 10) ** 0.6;
    const k = g * (1 - Math.exp(-exchange / g));
    const heat = (k * dt_s * (gas_K - this.ends[end]!)) / (1 + (0.5 * k * dt_s) / capacity);
    this.ends[end] = this.ends[end]! + heat / capacity;
    const h = this.fluidTable.enthalpyAt(gas_K) - heat / (massFlow * dt_s);
    return this.fluidTable.temperatureAt(h);
  }

  /** Gas through one ring; returns its outlet temperature [K]. */
  private march(
    r: number,
    dt: number,
    massFlow: number,
    inlet_K: number,
    forward: boolean,
  ): number {
    const { cells, shells: S } = this.p;
    const { enthalpy, temperature, mean, gas, surface, table, fluidTable } = this;
    const filmA = this.transferA.values;
    const filmB = this.transferB.values;
    const rockK = this.rockConductivity.values;
    const areaPerRing = ((Math.PI / 4) * (this.p.diameter_m * this.p.diameter_m)) / this.p.rings;
    const flux06 = (massFlow / areaPerRing) ** 0.6;
    const phi = this.heatTransferFactor;
    const shellMass = this.rockMass_kg / S;
    const aPerC = shellMass / (0.5 * dt);
    const aFluid = this.fluidCapacity / (0.5 * dt);
    const between = this.shellBetween;
    const sur = this.shellSurface;
    const scratch = this.shellScratch;
    const capacityTable = table.capacity;
    const temperatureTable = table.temperature;
    const perStep = table.perStep;
    const fluidT = fluidTable.temperature;
    const fluidPerStep = fluidTable.perStep;
    const gCp = this.p.fluid.heatCapacity;
    let Tin = inlet_K;
    let hin = fluidTable.enthalpyAt(inlet_K);
    for (let step = 0; step < cells; step++) {
      const k = r * cells + (forward ? step : cells - 1 - step);
      const base = k * S;
      const at = ((gas[k]! - 70) * 2 + 0.5) | 0;
      const film = phi * (filmA[at]! + flux06 * filmB[at]!);
      const g = massFlow * gCp(Tin);
      const n = film / g;
      const w = n > 2 ? 1 - 1 / n : 0.5;
      const ks = rockK[((mean[k]! - 70) * 2 + 0.5) | 0]!;
      // Elimination from the innermost shell outwards: psi_s = (rhs_s + K_s psi_(s+1))/d_s.
      let d = 0;
      let rhs = 0;
      let inner = 0;
      for (let s = 0; s < S; s++) {
        const c = capacityTable[(enthalpy[base + s]! * perStep + 0.5) | 0]!;
        const a = aPerC * c;
        const own = a + (s > 0 ? inner - (inner * inner) / d : 0);
        rhs = a * temperature[base + s]! + (s > 0 ? (inner * rhs) / d : 0);
        const next = s < S - 1 ? between[s]! * ks : 0;
        d = own + next;
        inner = next;
        scratch[s] = d;
        scratch[S + s] = rhs;
      }
      // Outermost shell, its surface and film in series, then the gas node.
      const toSurface = sur * ks;
      const link = (toSurface * film) / (toSurface + film);
      const flowLink = g / w;
      const gasOwn = flowLink + link + aFluid;
      const gasRhs = flowLink * Tin + aFluid * gas[k]!;
      let psi = (rhs + (link * gasRhs) / gasOwn) / (d + link - (link * link) / gasOwn);
      const psiGas = (gasRhs + link * psi) / gasOwn;
      const toRock = link * (psiGas - psi) * dt;
      surface[k] = psi + toRock / (dt * toSurface);
      const toFluid = 2 * this.fluidCapacity * (psiGas - gas[k]!);
      gas[k] = aFluid > 0 ? 2 * psiGas - gas[k]! : psiGas;
      // Back substitution, heat carried as enthalpy.
      let arriving = toRock;
      let sum = 0;
      for (let s = S - 1; s >= 0; s--) {
        let leaving = 0;
        if (s > 0) {
          const K = between[s - 1]! * ks;
          const below = (scratch[S + s - 1]! + K * psi) / scratch[s - 1]!;
          leaving = K * (psi - below) * dt;
          psi = below;
        }
        const h = enthalpy[base + s]! + (arriving - leaving) / shellMass;
        enthalpy[base + s] = h;
        const y = h * perStep;
        const i = y | 0;
        const T0 = temperatureTable[i]!;
        const T = T0 + (y - i) * (temperatureTable[i + 1]! - T0);
        temperature[base + s] = T;
        sum += T;
        arriving = leaving;
      }
      mean[k] = sum / S;
      hin -= (toRock + toFluid) / (massFlow * dt);
      const y = hin * fluidPerStep;
      const i = y | 0;
      const T0 = fluidT[i]!;
      Tin = T0 + (y - i) * (fluidT[i + 1]! - T0);
    }
    return Tin;
  }

  /** Without flow the grains even out inside: slowest mode of an insulated sphere, R^2/(4.4934^2 alpha). */
  private relaxShells(dt: number): void {
    const { rings, cells, shells: S, solid, particle_diameter_m } = this.p;
    for (let k = 0; k < rings * cells; k++) {
      const T = this.mean[k]!;
      const c =
        solid.density_kg_m3 *
        this.table.capacity[(this.enthalpy[k * S]! * this.table.perStep) | 0]!;
      const rate = (20.19 * this.rockConductivity.at(T)) / (c * (particle_diameter_m / 2) ** 2);
      const share = 1 - Math.exp(-rate * dt);
      let total = 0;
      for (let s = 0; s < S; s++) total += this.enthalpy[k * S + s]!;
      for (let s = 0; s < S; s++) {
        const j = k * S + s;
        this.enthalpy[j] = this.enthalpy[j]! + share * (total / S - this.enthalpy[j]!);
      }
      this.surface[k] = T;
      if (this.fluidCapacity === 0) this.gas[k] = T;
    }
  }

  /** Conduction along and across, wall, ends and losses: explicit, in as many parts as stability asks. */
  private conduct(dt_s: number, massFlow: number, ambient_K: number): void {
    const { p } = this;
    const area = (Math.PI / 4) * p.diameter_m ** 2;
    const stirred = (massFlow / area) * p.particle_diameter_m * p.fluid.heatCapacity(500);
    const hottest = this.bedConductivity.at(800) + 0.5 * stirred;
    const stiffness = (4 * hottest * area) / p.rings / (this.cellLength_m * this.rockMass_kg * 250);
    const parts = Math.max(1, Math.ceil((dt_s * stiffness) / 1.0));
    for (let part = 0; part < parts; part++) this.conductPart(dt_s / parts, stirred, ambient_K);
  }

  private conductPart(dt: number, stirred: number, ambient_K: number): void {
    const { p, mean, heat, wall, ends } = this;
    const { rings: R, cells: N, shells: S } = p;
    const kBed = this.bedConductivity.values;
    const dx = this.cellLength_m;
    const radius = p.diameter_m / 2;
    const areaRing = (Math.PI * radius * radius) / R;
    heat.fill(0);
    const along = (areaRing * dt) / dx;
    const axialStir = 0.5 * stirred;
    for (let r = 0; r < R; r++) {
      for (let i = 0, k = r * N; i < N - 1; i++, k++) {
        const a = mean[k]!;
        const b = mean[k + 1]!;
        const q = along * (kBed[(a + b - 140 + 0.5) | 0]! + axialStir) * (b - a);
        heat[k] = heat[k]! + q;
        heat[k + 1] = heat[k + 1]! - q;
      }
    }
    // Across: centroid radii of rings of equal area; Wakao's lateral stirring is 0.1 Re Pr kf.
    const middle = (r: number) => radius * Math.sqrt((r + 0.5) / R);
    const lateralStir = 0.1 * stirred;
    for (let r = 0; r < R - 1; r++) {
      const edge = radius * Math.sqrt((r + 1) / R);
      const across = (2 * Math.PI * edge * dx * dt) / (middle(r + 1) - middle(r));
      for (let i = 0, k = r * N; i < N; i++, k++) {
        const a = mean[k]!;
        const b = mean[k + N]!;
        const q = across * (kBed[(a + b - 140 + 0.5) | 0]! + lateralStir) * (b - a);
        heat[k] = heat[k]! + q;
        heat[k + N] = heat[k + N]! - q;
      }
    }
    const mantle = 2 * Math.PI * radius * dx;
    const toWall = radius - middle(R - 1);
    const wallCapacity = p.wall_capacity_J_m2K * mantle;
    for (let i = 0, k = (R - 1) * N; i < N; i++, k++) {
      const inner =
        1 / (1 / WALL_EXCHANGE_W_M2K + toWall / (kBed[((mean[k]! - 70) * 2) | 0]! + lateralStir));
      const q = mantle * dt * inner * (wall[i]! - mean[k]!);
      const lost = mantle * dt * p.wall_loss_W_m2K * (wall[i]! - ambient_K);
      heat[k] = heat[k]! + q;
      wall[i] = wall[i]! - (q + lost) / wallCapacity;
      this.lostHeat_J += lost;
    }
    for (let e = 0; e < 2; e++) {
      const steel = p.end_capacity_J_K[e]!;
      let gained = 0;
      const exchange = areaRing * dt * END_BED_EXCHANGE_W_M2K;
      if (steel > 0) {
        for (let r = 0; r < R; r++) {
          const k = r * N + (e === 0 ? 0 : N - 1);
          const q = exchange * (ends[e]! - mean[k]!);
          heat[k] = heat[k]! + q;
          gained -= q;
        }
        const lost = areaRing * R * dt * p.end_loss_W_m2K[e]! * (ends[e]! - ambient_K);
        ends[e] = ends[e]! + (gained - lost) / steel;
        this.lostHeat_J += lost;
      }
    }
    const { enthalpy, temperature } = this;
    const { temperature: table, perStep } = this.table;
    const perMass = 1 / this.rockMass_kg;
    for (let k = 0; k < R * N; k++) {
      const dh = heat[k]! * perMass;
      let sum = 0;
      for (let j = k * S; j < (k + 1) * S; j++) {
        const h = enthalpy[j]! + dh;
        enthalpy[j] = h;
        const y = h * perStep;
        const i = y | 0;
        const a = table[i]!;
        const T = a + (y - i) * (table[i + 1]! - a);
        temperature[j] = T;
        sum += T;
      }
      mean[k] = sum / S;
    }
  }

  /** Heat in rock, standing liquid, wall and end steel [J] above that at 70 K (rock) and 0 K (the rest). */
  totalHeat_J(): number {
    let sum = 0;
    const perShell = this.rockMass_kg / this.p.shells;
    for (let j = 0; j < this.enthalpy.length; j++) sum += perShell * this.enthalpy[j]!;
    for (let k = 0; k < this.gas.length; k++) sum += this.fluidCapacity * this.gas[k]!;
    const wall = Math.PI * this.p.diameter_m * this.cellLength_m * this.p.wall_capacity_J_m2K;
    for (let i = 0; i < this.wall.length; i++) sum += wall * this.wall[i]!;
    for (let e = 0; e < 2; e++) sum += this.p.end_capacity_J_K[e]! * this.ends[e]!;
    return sum;
  }

  /** Heat of the bed (rock and standing liquid) above a uniform reference [J]. */
  heatAbove_J(reference_K: number): number {
    const h0 = this.table.enthalpyAt(reference_K);
    const perShell = this.rockMass_kg / this.p.shells;
    let sum = 0;
    for (let j = 0; j < this.enthalpy.length; j++) sum += perShell * (this.enthalpy[j]! - h0);
    for (let k = 0; k < this.gas.length; k++)
      sum += this.fluidCapacity * (this.gas[k]! - reference_K);
    return sum;
  }

  /** Heat the bed holds between two uniform states [J]. */
  capacityBetween_J(low_K: number, high_K: number): number {
    const cells = this.p.rings * this.p.cells;
    const rock = this.rockMass_kg * (this.table.enthalpyAt(high_K) - this.table.enthalpyAt(low_K));
    return cells * (rock + this.fluidCapacity * (high_K - low_K));
  }
}
