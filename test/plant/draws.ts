import type { MachineDraw } from './cycle.js';
import type { PlantGeometry, StoreGeometry } from './geometry.js';
import { RandomStream } from './random.js';
import { layOutRings, type RingLayout } from './tubes.js';

/** Which parts of the plant are drawn at random. */
export interface DrawOptions {
  /** nominal: as the geometry says; random: within the uncertainty of a real plant. */
  readonly physics: 'nominal' | 'random';
  readonly machine: 'known' | 'random';
  /** exact: noise and lag only; independent: an offset per thermocouple; class: all errors of the class. */
  readonly sensors: 'exact' | 'independent' | 'class';
  readonly meter: 'exact' | 'random';
}

export interface StoreDraw {
  readonly heat_capacity_factor: number;
  readonly heat_transfer_factor: number;
  readonly void_fraction: number;
  readonly conductivity_factor: number;
  readonly stirring_factor: number;
  readonly loss_factor: number;
  readonly layout: RingLayout;
  /** Share of flow over share of area, one per ring; the area-weighted mean is 1. */
  readonly ring_flow: readonly number[];
}

export interface ThermocoupleDraw {
  readonly lag_s: number;
  /** Share of the gas temperature in what the junction sees; the rest is the particle surface. */
  readonly gas_share: number;
  readonly position_error_m: number;
  readonly offset_K: number;
  /** Error per kelvin of distance from 0 degC. */
  readonly gain: number;
}

export interface GroupDraw {
  readonly amplitude_K: number;
  readonly daily_phase: number;
  readonly slow_amplitude_K: number;
  readonly slow_phase: number;
}

export interface MeterDraw {
  readonly bias: number;
  /** Change of the relative error from no load to rated flow. */
  readonly slope: number;
}

export interface AmbientDraw {
  readonly mean_K: number;
  readonly swing_K: number;
}

export interface PlantDraw {
  readonly stores: Readonly<Record<string, StoreDraw>>;
  readonly thermocouples: Readonly<Record<string, ThermocoupleDraw>>;
  readonly gasSensors: Readonly<Record<string, ThermocoupleDraw>>;
  readonly groups: Readonly<Record<string, GroupDraw>>;
  readonly meter: MeterDraw;
  readonly machine: MachineDraw;
  readonly ambient: AmbientDraw;
}

/** Draws are bounded at two standard deviations: the bounds are those stated beside each. */
export function drawPlant(geometry: PlantGeometry, seed: number, options: DrawOptions): PlantDraw {
  const stores: Record<string, StoreDraw> = {};
  const thermocouples: Record<string, ThermocoupleDraw> = {};
  const groups: Record<string, GroupDraw> = {};
  for (const store of geometry.stores) {
    stores[store.id] = drawStore(store, seed, options.physics === 'random');
    for (const string of store.strings) {
      for (const t of string.thermocouples) {
        thermocouples[t.id] = drawThermocouple(
          store,
          new RandomStream(seed, `sensor ${t.id}`),
          options,
        );
        if (t.group !== null && groups[t.group] === undefined) {
          groups[t.group] = drawGroup(new RandomStream(seed, `group ${t.group}`), options);
        }
      }
    }
  }
  const gasSensors: Record<string, ThermocoupleDraw> = {};
  for (const channel of geometry.channels) {
    if (channel.measures !== 'gas_temperature') continue;
    const random = new RandomStream(seed, `sensor ${channel.id}`);
    gasSensors[channel.id] = {
      lag_s: random.uniform(10, 30),
      gas_share: 1,
      position_error_m: 0,
      // Better instruments, often doubled: +/-1 K.
      offset_K: options.sensors === 'exact' ? 0 : random.boundedNormal(0.5),
      gain: 0,
    };
  }
  const meterStream = new RandomStream(seed, 'meter');
  const weather = new RandomStream(seed, 'ambient');
  return {
    stores,
    thermocouples,
    gasSensors,
    groups,
    meter:
      options.meter === 'random'
        ? { bias: meterStream.boundedNormal(0.01), slope: meterStream.boundedNormal(0.01) }
        : { bias: 0, slope: 0 },
    machine: drawMachine(new RandomStream(seed, 'machine'), options.machine === 'random'),
    ambient:
      options.physics === 'random'
        ? { mean_K: 273.15 + weather.uniform(3, 27), swing_K: weather.uniform(1, 3) }
        : { mean_K: 288.15, swing_K: 0 },
  };
}

function drawStore(store: StoreGeometry, seed: number, random: boolean): StoreDraw {
  const layout = layOutRings(store);
  const { shares } = layout;
  if (!random) {
    return {
      heat_capacity_factor: 1,
      heat_transfer_factor: 1,
      void_fraction: store.void_fraction,
      conductivity_factor: 1,
      stirring_factor: 1,
      loss_factor: 1,
      layout,
      ring_flow: shares.map(() => 1),
    };
  }
  const r = new RandomStream(seed, `store ${store.id}`);
  // Rings differ by +/-3 %; the looser packing at the wall lets through the last what up to 0.7
  // particle diameters more of bed would pass (published profiles for spheres: about 0.6).
  const last = shares.length - 1;
  const lastThickness_m = (store.diameter_m / 2) * (1 - Math.sqrt(1 - shares[last]!));
  const excess = (r.uniform(0, 0.7) * store.particle_diameter_m) / lastThickness_m;
  const flow = shares.map((_, i) => 1 + r.boundedNormal(0.015) + (i === last ? excess : 0));
  const mean = flow.reduce((sum, f, i) => sum + f * shares[i]!, 0);
  return {
    heat_capacity_factor: 1 + r.boundedNormal(0.015), // +/-3 %
    heat_transfer_factor: Math.exp(r.boundedNormal(0.2)), // a factor of 1.5 either way
    void_fraction: store.void_fraction + r.boundedNormal(0.006), // +/-0.012
    conductivity_factor: Math.exp(r.boundedNormal(0.2)),
    stirring_factor: Math.exp(r.boundedNormal(0.15)),
    loss_factor: Math.exp(r.boundedNormal(0.2)),
    layout,
    ring_flow: flow.map((f) => f / mean),
  };
}

function drawThermocouple(
  store: StoreGeometry,
  r: RandomStream,
  options: DrawOptions,
): ThermocoupleDraw {
  const lag_s = r.uniform(30, 180);
  const gas_share = r.uniform(0, 1);
  const cold = store.kind === 'cold';
  // IEC 60584-1 [M]: class 1 +/-1.5 K or 0.4 %, class 3 (cold) +/-2.5 K or 1.5 %.
  const offset = r.boundedNormal(cold ? 1.25 : 0.75);
  const gain = r.boundedNormal(cold ? 0.0075 : 0.002);
  const position = r.boundedNormal(0.01); // +/-20 mm
  const all = options.sensors === 'class';
  return {
    lag_s,
    gas_share,
    offset_K: options.sensors === 'exact' ? 0 : offset,
    gain: all ? gain : 0,
    position_error_m: all ? position : 0,
  };
}

function drawGroup(r: RandomStream, options: DrawOptions): GroupDraw {
  const on = options.sensors === 'class' ? 1 : 0;
  return {
    amplitude_K: on * r.uniform(0.3, 0.8),
    daily_phase: r.uniform(0, 2 * Math.PI),
    slow_amplitude_K: on * r.uniform(0, 0.2),
    slow_phase: r.uniform(0, 2 * Math.PI),
  };
}

function drawMachine(r: RandomStream, random: boolean): MachineDraw {
  if (!random) {
    return {
      compressor_points: 0,
      expander_points: 0,
      loop_pressure_loss: null,
      loss_follows_flow: 0,
      pipe_loss_W_K: 0,
    };
  }
  return {
    compressor_points: r.uniform(-0.015, 0.015),
    expander_points: r.uniform(-0.015, 0.015),
    loop_pressure_loss: r.uniform(0.02, 0.06),
    loss_follows_flow: r.uniform(0.3, 0.8),
    pipe_loss_W_K: r.uniform(0, 30),
  };
}

/** Error shared by a card or cold junction at a time of day [K], at most 1 K. */
export function groupError(draw: GroupDraw, time_s: number): number {
  const day = (2 * Math.PI * time_s) / 86400;
  return (
    draw.amplitude_K * Math.sin(day + draw.daily_phase) +
    draw.slow_amplitude_K * Math.sin(4.53 * day + draw.slow_phase)
  );
}
