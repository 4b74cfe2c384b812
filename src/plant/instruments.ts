import type { ChannelDefinition, UnitDefinition } from '../core/definitions.js';
import { CELLS } from './bedState.js';
import type { PlantStore } from './plantStore.js';
import type { Random } from './random.js';
import { toRaw } from './rawUnits.js';
import { pressureDrop } from './transferLaws.js';

/** What the instruments look at. */
export interface PlantView {
  readonly stores: readonly PlantStore[];
  /** True flow and net power, positive while charging [kg/s, W]. */
  readonly flow_kg_s: number;
  readonly power_W: number;
  readonly ambient_K: number;
  readonly time_s: number;
}

interface Junction {
  readonly channel: ChannelDefinition;
  readonly store: PlantStore;
  /** Lower cell and share of the upper one. */
  readonly cell: number;
  readonly share: number;
  readonly lag_s: number;
  readonly gasShare: number;
  readonly offset_K: number;
  readonly groupPhase: number;
}

/** 1-sigma noise of a reading. */
const NOISE_K = 0.15;
const NOISE_FLOW = 0.003;
const NOISE_POWER = 0.002;
const GROUP_SWING_K = 0.3;

/** Instruments of the demonstration plant: lag, offsets and noise as usual in the trade, and one that sticks. */
export class Instruments {
  private readonly junctions: readonly Junction[];
  private readonly junction_K: Float64Array;
  private readonly meterFactor: number;
  private readonly published = new Map<string, { readonly si: number; readonly at_s: number }>();
  private stuck: { readonly channel: string; readonly value: number } | null = null;

  constructor(
    private readonly unit: UnitDefinition,
    stores: readonly PlantStore[],
    private readonly random: Random,
  ) {
    for (const channel of unit.channels) toRaw(channel.id, channel.raw_unit, 300);
    this.junctions = unit.channels.flatMap((channel): Junction[] => {
      const { role } = channel;
      if (role.kind !== 'thermocouple') return [];
      const store = stores.find((s) => s.definition.id === role.store);
      const strings = store?.definition.strings ?? [];
      const string = strings.findIndex((s) => s.id === role.string);
      const place = strings[string]?.thermocouples.find((t) => t.id === channel.id);
      if (!store || !place)
        throw new RangeError(`channel ${channel.id} has no place in store ${role.store}`);
      const x = (place.position_m / store.definition.bed.length_m) * CELLS - 0.5;
      const low = Math.min(Math.max(Math.floor(x), 0), CELLS - 2);
      return [
        {
          channel,
          store,
          cell: store.order.indexOf(string) * CELLS + low,
          share: Math.min(Math.max(x - low, 0), 1),
          lag_s: 50 + 70 * random.uniform(),
          gasShare: 0.2 + 0.6 * random.uniform(),
          offset_K: 0.5 * random.normal(),
          groupPhase: phaseOf(place.group ?? role.string),
        },
      ];
    });
    this.junction_K = Float64Array.from(this.junctions, (j) => this.seen(j));
    this.meterFactor = 1 + 0.008 * random.normal();
  }

  /** Thermowells follow what they see for `dt_s`. */
  follow(dt_s: number): void {
    this.junctions.forEach((junction, n) => {
      const now = this.seen(junction);
      const was = this.junction_K[n] as number;
      this.junction_K[n] = now + (was - now) * Math.exp(-dt_s / junction.lag_s);
    });
  }

  private seen({ store, cell, share, gasShare }: Junction): number {
    const { rock_K, gas_K } = store.bed;
    const mix = (j: number) =>
      gasShare * (gas_K[j] as number) + (1 - gasShare) * (rock_K[j] as number);
    return (1 - share) * mix(cell) + share * mix(cell + 1);
  }

  /** From now on this channel repeats its next reading. */
  stick(channel: string): void {
    if (this.stuck === null) this.stuck = { channel, value: Number.NaN };
  }

  /**
   * One reading of every channel in its raw unit. A channel that reports by exception is left out
   * while it stays within its deadband and has not been silent for too long.
   */
  read(view: PlantView): Record<string, number> {
    const values: Record<string, number> = {};
    let n = 0;
    for (const channel of this.unit.channels) {
      const si =
        channel.role.kind === 'thermocouple'
          ? this.thermocouple(this.junctions[n] as Junction, this.junction_K[n++] as number, view)
          : this.other(channel, view);
      if (this.due(channel, si, view.time_s))
        values[channel.id] = toRaw(channel.id, channel.raw_unit, si);
    }
    return values;
  }

  private thermocouple(junction: Junction, T: number, view: PlantView): number {
    const day = (2 * Math.PI * view.time_s) / 86400;
    const value =
      T +
      junction.offset_K +
      GROUP_SWING_K * Math.sin(day + junction.groupPhase) +
      NOISE_K * this.random.normal();
    if (this.stuck?.channel !== junction.channel.id) return value;
    if (Number.isNaN(this.stuck.value)) this.stuck = { ...this.stuck, value };
    return this.stuck.value;
  }

  private other(channel: ChannelDefinition, view: PlantView): number {
    const { role } = channel;
    const z = this.random.normal();
    const { flow_kg_s: flow, power_W: power, ambient_K } = view;
    const storeOf = (id: string): PlantStore => {
      const store = view.stores.find((s) => s.definition.id === id);
      if (!store)
        throw new RangeError(
          `channel ${channel.id} names store ${id}, which the unit does not have`,
        );
      return store;
    };
    switch (role.kind) {
      case 'flow': {
        const read = flow * this.meterFactor * (1 + NOISE_FLOW * z);
        if (role.sense === 'signed') return read;
        if (role.sense === 'unsigned') return Math.abs(read);
        return Math.max(0, role.sense === 'charge' ? read : -read);
      }
      case 'gas_temperature':
        return storeOf(role.store).pipes_K[role.end === 'charge_inlet' ? 0 : 1] + NOISE_K * z;
      case 'mode':
        return Math.sign(flow);
      case 'valve':
        return Math.sign(flow) === (role.opens === 'charge' ? 1 : -1) ? 1 : 0;
      case 'power':
        return power * (1 + NOISE_POWER * z);
      case 'auxiliary_power': {
        const { auxiliary_running_W, auxiliary_standing_W } = this.unit.machine;
        return (flow === 0 ? auxiliary_standing_W : auxiliary_running_W) * (1 + NOISE_POWER * z);
      }
      case 'ambient_temperature':
        return ambient_K + NOISE_K * z;
      case 'pressure':
        return storeOf(role.store).definition.bed.pressure_Pa * (1 + 0.001 * z);
      case 'pressure_drop': {
        const { definition, bed } = storeOf(role.store);
        return (
          pressureDrop(
            definition.bed,
            flow / definition.bed.area_m2,
            bed.gas_K.subarray(0, CELLS),
          ) *
          (1 + 0.01 * z)
        );
      }
      case 'shell_temperature': {
        const { definition, bed } = storeOf(role.store);
        const cell = Math.min(
          CELLS - 1,
          Math.floor((role.position_m / definition.bed.length_m) * CELLS),
        );
        const inside = bed.rock_K[(bed.areaShares.length - 1) * CELLS + cell] as number;
        // Insulation passes U to a shell that gives 8 W/m2K to the air.
        const u = definition.bed.wall_loss_W_m2K * definition.bed.loss_factor;
        return ambient_K + ((inside - ambient_K) * u) / 8 + NOISE_K * z;
      }
      case 'cold_junction':
        return ambient_K + 5 + 0.1 * z;
      case 'thermocouple':
        throw new RangeError(`channel ${channel.id} is a thermocouple in the bed`);
    }
  }

  private due(channel: ChannelDefinition, si: number, time_s: number): boolean {
    if (channel.reporting.kind === 'periodic') return true;
    const last = this.published.get(channel.id);
    const { deadband, longest_silence_s } = channel.reporting;
    const due =
      !last || Math.abs(si - last.si) > deadband || time_s - last.at_s >= longest_silence_s;
    if (due) this.published.set(channel.id, { si, at_s: time_s });
    return due;
  }
}

/** Sensors of one group swing together over the day. */
function phaseOf(group: string): number {
  let sum = 0;
  for (const letter of group) sum = (sum * 31 + letter.charCodeAt(0)) % 1009;
  return (2 * Math.PI * sum) / 1009;
}
