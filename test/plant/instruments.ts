import { applyFaults, type SensorFault } from './faults.js';
import type { ChannelMeasure, PlantGeometry } from './geometry.js';
import type { MachineRoom } from './machineRoom.js';
import { RandomStream } from './random.js';
import { NOISE } from './sensors.js';

/** All that is read: junctions in the pipes, meters, noise, and what goes wrong with the reading. */
export class Instruments {
  private readonly noise: RandomStream;
  private readonly pipeJunction: Record<string, number>;
  private readonly stuck: Map<string, number>;
  private readonly groupOf = new Map<string, string | null>();
  private readonly flowChannels: readonly string[];

  constructor(
    private readonly geometry: PlantGeometry,
    seed: number,
    from?: Instruments,
  ) {
    this.noise = from ? from.noise.clone() : new RandomStream(seed, 'noise');
    this.pipeJunction = from ? { ...from.pipeJunction } : {};
    this.stuck = new Map(from?.stuck);
    this.flowChannels = geometry.channels.filter((c) => c.measures === 'flow').map((c) => c.id);
    for (const store of geometry.stores) {
      for (const string of store.strings) {
        for (const t of string.thermocouples) this.groupOf.set(t.id, t.group);
      }
    }
  }

  clone(): Instruments {
    return new Instruments(this.geometry, 0, this);
  }

  /** Thermowells in the pipes follow the gas; those in the beds do so with their store. */
  follow(room: MachineRoom, dt_s: number): void {
    for (const channel of this.geometry.channels) {
      if (channel.measures !== 'gas_temperature') continue;
      const T = storeOf(room, channel.store).pipe_K[channel.end];
      const was = this.pipeJunction[channel.id];
      const { lag_s } = room.draw.gasSensors[channel.id]!;
      this.pipeJunction[channel.id] =
        was === undefined ? T : T + (was - T) * Math.exp(-dt_s / lag_s);
    }
  }

  /** Reads all sensors; the noise advances, so one call per scan. SI units, NaN = missing. */
  read(room: MachineRoom, faults: readonly SensorFault[]): Record<string, number> {
    const readings: Record<string, number> = {};
    for (const store of room.stores) store.thermocouples.read(room.elapsed_s, this.noise, readings);
    for (const channel of this.geometry.channels) {
      readings[channel.id] = this.value(channel, room, this.noise.normal());
    }
    applyFaults(readings, faults, room.elapsed_s, this.stuck, this.groupOf, this.flowChannels);
    return readings;
  }

  private value(
    channel: { readonly id: string } & ChannelMeasure,
    room: MachineRoom,
    z: number,
  ): number {
    const { machine, rated_power_W } = this.geometry;
    switch (channel.measures) {
      case 'flow': {
        const flow = room.flow_kg_s * meterFactor(room) * (1 + NOISE.flow * z);
        if (channel.sense === 'unsigned') return Math.abs(flow);
        if (channel.sense === 'charge') return Math.max(0, flow);
        return channel.sense === 'discharge' ? Math.max(0, -flow) : flow;
      }
      case 'valve':
        return room.mode === channel.opens ? 1 : 0;
      case 'power':
        return (
          room.power_W + NOISE.power * z * Math.max(Math.abs(room.power_W), 0.02 * rated_power_W)
        );
      case 'auxiliary_power': {
        const standing = room.mode === 'stand';
        return (
          (standing ? machine.auxiliary_standing_W : machine.auxiliary_running_W) *
          (1 + NOISE.power * z)
        );
      }
      case 'mode':
        return room.mode === 'charge' ? 1 : room.mode === 'stand' ? 0 : -1;
      case 'ambient_temperature':
        return room.ambient_K() + NOISE.ambient_K * z;
      case 'cold_junction':
        // The cabinet follows the day; what the compensation misses is the error of the group.
        return 298.15 + 4 * Math.sin((2 * Math.PI * room.elapsed_s) / 86400);
      case 'gas_temperature': {
        const T = this.pipeJunction[channel.id] ?? storeOf(room, channel.store).pipe_K[channel.end];
        return T + room.draw.gasSensors[channel.id]!.offset_K + NOISE.gas_K * z;
      }
      case 'pressure':
        return storeOf(room, channel.store).pressure_Pa * (1 + NOISE.pressure * z);
      case 'pressure_drop':
        return (
          storeOf(room, channel.store).pressureDrop_Pa(room.flow_kg_s) *
          (1 + NOISE.pressure_drop * z)
        );
    }
  }
}

/** Mean reading of the flow meter over the true flow; its error changes with load. */
export function meterFactor(room: MachineRoom): number {
  const { bias, slope } = room.draw.meter;
  return 1 + bias + (slope * Math.abs(room.flow_kg_s)) / room.geometry.rated_flow_kg_s;
}

function storeOf(room: MachineRoom, id: string) {
  const store = room.stores.find((s) => s.geometry.id === id);
  if (!store) throw new RangeError(`store ${id} of a channel is not in the plant`);
  return store;
}
