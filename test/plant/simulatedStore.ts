import { type Bed, createBed } from './bed.js';
import type { PlantDraw } from './draws.js';
import { fluidAt } from './fluids.js';
import { frontsOf, type TruthFront } from './fronts.js';
import { type StoreGeometry, topEnd } from './geometry.js';
import { ThermocoupleArray } from './sensors.js';
import { SOLIDS } from './solids.js';
import { pressureGradient } from './transfer.js';
import { channelled, meanProfile, type RingLayout, tubeFlow } from './tubes.js';

/**
 * Steel of the pipe between a store and the machine's coolers: 12 m of DN 600 with 10 mm of wall,
 * pi 0.6 0.01 12 m3 x 7850 kg/m3 x 500 J/kgK [J/K].
 */
const PIPE_CAPACITY_J_K = 0.9e6;

export interface Resolution {
  readonly cells: number;
  readonly shells: number;
}

export interface StringTruth extends TubeTruth {
  readonly id: string;
}

export interface TubeTruth {
  readonly flow_factor: number;
  readonly position_m: number | null;
  readonly width_m: number | null;
}

/** The true state of one store. */
export interface StoreTruth {
  readonly soc: number;
  readonly stored_MWh_th: number;
  /** Heat between the two references when full [MWh_th]. */
  readonly capacity_MWh_th: number;
  /** Of the area-mean profile, ordered by x. */
  readonly fronts: readonly TruthFront[];
  readonly energy_position_m: number;
  /** Gas entering and leaving the store [K]; null while none passes. */
  readonly inlet_K: number | null;
  readonly outlet_K: number | null;
  /** Flow through the bed that no meter sees, positive as while charging [kg/s]. */
  readonly leak_kg_s: number;
  /** hv over that of the geometry with Wakao & Kaguei. */
  readonly heat_transfer_factor: number;
  readonly heat_capacity_factor: number;
  readonly strings: readonly StringTruth[];
  readonly rings: readonly TubeTruth[];
}

/** One store of the simulation: bed, thermocouples, gas at both ends and what is true of it. */
export class SimulatedStore {
  readonly bed: Bed;
  readonly thermocouples: ThermocoupleArray;
  /** Gas at the charge inlet and the discharge inlet, as the sensors in the pipes meet it [K]. */
  readonly pipe_K: [number, number];
  inlet_K: number | null = null;
  outlet_K: number | null = null;
  leak_kg_s = 0;
  /** On the bed's pressure drop while its coldest rock is below `dropBelow_K`. */
  dropFactor = 1;
  dropBelow_K = Number.POSITIVE_INFINITY;
  /** Pressure and density of the gas over what they are by the geometry. */
  gasShare = 1;
  private baseRingFlow: readonly number[];
  readonly layout: RingLayout;

  constructor(
    readonly geometry: StoreGeometry,
    private readonly draw: PlantDraw,
    resolution: Resolution,
    from?: SimulatedStore,
  ) {
    if (from) {
      this.bed = from.bed.clone();
      this.thermocouples = new ThermocoupleArray(geometry, this.bed, draw, from.thermocouples);
      this.pipe_K = [...from.pipe_K];
      this.inlet_K = from.inlet_K;
      this.outlet_K = from.outlet_K;
      this.leak_kg_s = from.leak_kg_s;
      this.dropFactor = from.dropFactor;
      this.dropBelow_K = from.dropBelow_K;
      this.gasShare = from.gasShare;
      this.baseRingFlow = from.baseRingFlow;
      this.layout = from.layout;
      return;
    }
    const own = draw.stores[geometry.id]!;
    const fluid = fluidAt(geometry.fluid, geometry.pressure_Pa);
    const solid = typeof geometry.solid === 'string' ? SOLIDS[geometry.solid] : geometry.solid;
    if (!solid) throw new RangeError(`solid ${String(geometry.solid)} is not known here`);
    this.layout = own.layout;
    this.bed = createBed({
      ...geometry,
      ...resolution,
      ring_shares: own.layout.shares,
      solid,
      fluid,
      void_fraction: own.void_fraction,
      heat_capacity_factor: own.heat_capacity_factor,
      conductivity_factor: own.conductivity_factor,
      stirring_factor: own.stirring_factor,
      wall_loss_W_m2K: geometry.wall_loss_W_m2K * own.loss_factor,
      end_loss_W_m2K: [
        geometry.end_loss_W_m2K[0] * own.loss_factor,
        geometry.end_loss_W_m2K[1] * own.loss_factor,
      ],
      // 15 mm of steel: 0.015 m x 7850 kg/m3 x 500 J/kgK.
      wall_capacity_J_m2K: 59e3,
      end_exchange_W_K: 6e3,
    });
    this.bed.heatTransferFactor = own.heat_transfer_factor;
    this.baseRingFlow = own.ring_flow;
    this.bed.ringFlow.set(own.ring_flow);
    this.thermocouples = new ThermocoupleArray(geometry, this.bed, draw);
    this.pipe_K = [288.15, 288.15];
  }

  clone(): SimulatedStore {
    return new SimulatedStore(this.geometry, this.draw, this.bed.p, this);
  }

  /** A front at `front_m` with half the 16-84 % distance `width_m` between the references. */
  start(front_m: number, width_m: number): void {
    const { reference_hot_K: hot, reference_cold_K: cold, kind } = this.geometry;
    const [behind, ahead] = kind === 'hot' ? [hot, cold] : [cold, hot];
    // tanh profile: 16 and 84 % lie at -/+ atanh(0.68) scales.
    const scale = width_m / Math.atanh(0.68);
    this.bed.fill((x) => {
      const charged = 0.5 * (1 - Math.tanh((x - front_m) / scale));
      return ahead + (behind - ahead) * charged;
    });
    this.pipe_K[0] = this.bed.ends[0]!;
    this.pipe_K[1] = this.bed.ends[1]!;
    this.thermocouples.follow(this.bed, 1e9, this.topGas_K);
  }

  /** Gas that would leave now in that direction, known also before the first step of it [K]. */
  outletFor(charging: boolean): number {
    return this.pipe_K[charging ? 1 : 0];
  }

  /** Gas above the bed, in the space under the lid [K]. */
  private get topGas_K(): number {
    return this.pipe_K[topEnd(this.geometry)];
  }

  /**
   * One step of rest. What leaks through the bed has passed the machine's coolers and comes at
   * ambient temperature along the pipe, whose steel gives it its heat: gas and steel of the pipe
   * relax together towards ambient with PIPE_CAPACITY/(m cp), 4.4 h at 0.5 % of the rated flow.
   * @param seen_kg_s flow that the meter sees, at ambient temperature
   * @param leak_kg_s flow that it does not see
   */
  stand(dt_s: number, seen_kg_s: number, leak_kg_s: number, ambient_K: number): void {
    if (leak_kg_s === 0) {
      this.step(dt_s, seen_kg_s, ambient_K, ambient_K);
      return;
    }
    const end = leak_kg_s > 0 ? 0 : 1;
    const pipe_K = this.pipe_K[end];
    const g = Math.abs(leak_kg_s) * this.bed.c.gasCapacity.at(pipe_K);
    const inlet_K = ambient_K + (pipe_K - ambient_K) * Math.exp((-dt_s * g) / PIPE_CAPACITY_J_K);
    this.step(dt_s, seen_kg_s + leak_kg_s, inlet_K, ambient_K);
    this.leak_kg_s = leak_kg_s;
  }

  step(dt_s: number, flow_kg_s: number, inlet_K: number, ambient_K: number): void {
    this.leak_kg_s = 0;
    const outlet = this.bed.step(dt_s, flow_kg_s, inlet_K, ambient_K);
    if (flow_kg_s !== 0) {
      const charging = flow_kg_s > 0;
      this.pipe_K[charging ? 0 : 1] = inlet_K;
      this.pipe_K[charging ? 1 : 0] = outlet;
      this.inlet_K = inlet_K;
      this.outlet_K = outlet;
    } else {
      // Standing gas in the pipe takes the temperature of the steel around it.
      const share = 1 - Math.exp(-dt_s / 600);
      for (const e of [0, 1] as const)
        this.pipe_K[e] += share * (this.bed.ends[e]! - this.pipe_K[e]);
      this.inlet_K = null;
      this.outlet_K = null;
    }
    this.thermocouples.follow(this.bed, dt_s, this.topGas_K);
  }

  channel(string: string, factor: number): void {
    const s = this.geometry.strings.findIndex((known) => known.id === string);
    if (s < 0) throw new RangeError(`string ${string} is not in store ${this.geometry.id}`);
    this.bed.ringFlow.set(channelled(this.baseRingFlow, this.layout, s, factor));
  }

  get pressure_Pa(): number {
    return this.geometry.pressure_Pa * this.gasShare;
  }

  pressureDrop_Pa(flow_kg_s: number): number {
    const { p } = this.bed;
    const area = (Math.PI / 4) * p.diameter_m ** 2;
    const profile = this.profile();
    let sum = 0;
    for (const T of profile) {
      sum += pressureGradient(
        flow_kg_s / area,
        p.fluid.density(T) * this.gasShare,
        p.fluid.viscosity(T),
        p.particle_diameter_m,
        p.void_fraction,
      );
    }
    const factor = this.bed.mean.some((T) => T < this.dropBelow_K) ? this.dropFactor : 1;
    return sum * this.bed.c.cellLength_m * factor;
  }

  /** Area-mean temperature of the rock over x, cell centres [K]. */
  profile(): Float64Array {
    return meanProfile(
      this.bed,
      this.layout.shares.map((_, r) => r),
    );
  }

  /** The same of the tube of one string. */
  tubeProfile(string: number): Float64Array {
    return meanProfile(this.bed, this.layout.ringsOf[string]!);
  }

  truth(): StoreTruth {
    const { bed, geometry } = this;
    const { reference_hot_K: hot, reference_cold_K: cold, kind } = geometry;
    const [empty, full] = kind === 'hot' ? [cold, hot] : [hot, cold];
    const capacity = Math.abs(bed.capacityBetween_J(empty, full));
    const stored = kind === 'hot' ? bed.heatAbove_J(empty) : -bed.heatAbove_J(empty);
    const fronts = (T: Float64Array) => frontsOf(T, bed.c.cellLength_m, cold, hot);
    const tube = (flow_factor: number, T: Float64Array): TubeTruth => {
      const only = fronts(T);
      const one = only.length === 1 ? only[0]! : null;
      return { flow_factor, position_m: one?.position_m ?? null, width_m: one?.width_m ?? null };
    };
    const flows = tubeFlow(bed, this.layout);
    const ringProfile = (r: number) => bed.mean.slice(r * bed.p.cells, (r + 1) * bed.p.cells);
    return {
      soc: stored / capacity,
      stored_MWh_th: stored / 3.6e9,
      capacity_MWh_th: capacity / 3.6e9,
      fronts: fronts(this.profile()),
      energy_position_m: (stored / capacity) * geometry.length_m,
      inlet_K: this.inlet_K,
      outlet_K: this.outlet_K,
      leak_kg_s: this.leak_kg_s,
      heat_transfer_factor: bed.heatTransferFactor,
      heat_capacity_factor: this.draw.stores[geometry.id]!.heat_capacity_factor,
      strings: geometry.strings.map((s, i) => ({
        id: s.id,
        ...tube(flows[i]!, this.tubeProfile(i)),
      })),
      rings: Array.from({ length: bed.c.rings }, (_, r) => tube(bed.ringFlow[r]!, ringProfile(r))),
    };
  }
}
