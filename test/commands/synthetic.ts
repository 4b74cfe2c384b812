import { type RecordedField, RecordingWriter } from '../../src/adapters/recording/writer.js';
import type { ChannelDefinition, UnitDefinition } from '../../src/core/definitions.js';
import { fromSi } from '../../src/core/units.js';

/** Flow of the synthetic charge [kg/s] and its start, 2025-03-01T06:00:00Z [ms]. */
const FLOW_KG_S = 15;
export const START_MS = Date.UTC(2025, 2, 1, 6);

/** Smooth step from 1 to 0 around x = 0. */
function step(x: number): number {
  return 0.5 * (1 - Math.tanh(x));
}

/** What a channel would read while a front moves down its store; raw units. No physics is claimed. */
export function syntheticReading(
  unit: UnitDefinition,
  channel: ChannelDefinition,
  time_s: number,
): number | null {
  const { role } = channel;
  const store = (id: string) => unit.stores.find((one) => one.id === id);
  const inSi = (): number | null => {
    switch (role.kind) {
      case 'thermocouple': {
        const { reference_hot_K, reference_cold_K, kind, strings, bed } = store(role.store)!;
        const sensor = strings
          .flatMap((string) => string.thermocouples)
          .find((one) => one.id === channel.id)!;
        const front_m = 0.3 * bed.length_m + (time_s / 3600) * 0.4;
        const theta = step((sensor.position_m - front_m) / 0.8);
        const [entering, before] =
          kind === 'hot'
            ? [reference_hot_K, reference_cold_K]
            : [reference_cold_K, reference_hot_K];
        return before + (entering - before) * theta;
      }
      case 'gas_temperature': {
        const { reference_hot_K, reference_cold_K, kind } = store(role.store)!;
        return (kind === 'hot') === (role.end === 'charge_inlet')
          ? reference_hot_K
          : reference_cold_K;
      }
      case 'flow':
        return role.sense === 'discharge' ? 0 : FLOW_KG_S;
      case 'mode':
        return 1;
      case 'valve':
        return role.opens === 'charge' ? 1 : 0;
      case 'power':
        return unit.rated_power_W;
      case 'pressure':
        return store(role.store)!.bed.pressure_Pa;
      case 'ambient_temperature':
        return unit.ambient_K;
      default:
        return null;
    }
  };
  const value = inSi();
  if (value === null || role.kind === 'mode' || role.kind === 'valve') return value;
  return fromSi(channel.raw_unit, value);
}

export interface SyntheticOptions {
  readonly rows: number;
  /** Rows in which every field is empty. */
  readonly empty?: readonly number[];
}

/** Writes a recording of a unit that charges, one row per scan period. */
export async function writeSynthetic(
  path: string,
  unit: UnitDefinition,
  { rows, empty = [] }: SyntheticOptions,
): Promise<void> {
  const { channels } = unit;
  const writer = await RecordingWriter.open(
    path,
    channels.map((channel) => channel.id),
  );
  for (let row = 0; row < rows; row++) {
    const time_s = row * unit.scan_period_s;
    const fields: RecordedField[] = channels.map((channel) =>
      empty.includes(row) ? null : syntheticReading(unit, channel, time_s),
    );
    await writer.write(START_MS + time_s * 1000, fields);
  }
  await writer.close();
}
