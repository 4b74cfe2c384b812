import type { ChannelDefinition, UnitDefinition } from '../definitions.js';
import { celsiusFromMillivolt } from '../thermocouple/its90.js';
import { toSi, ZERO_CELSIUS_K } from '../units.js';

/**
 * The function that turns one raw number of a channel into SI: K, kg/s, W, Pa; +1, 0 or -1 for a
 * mode; 0..1 for a valve. Millivolts pass through: they need their cold junction, see
 * `voltageFinish`.
 *
 * @param channel the channel, whose role and raw_unit decide
 * @returns raw number -> SI. NaN stays NaN; a mode other than +1, 0, -1 becomes NaN.
 * @throws RangeError for an unknown unit
 */
export function rawToSi(channel: ChannelDefinition): (raw: number) => number {
  if (channel.role.kind === 'mode') {
    return (raw) => (raw === 1 || raw === 0 || raw === -1 ? raw : Number.NaN);
  }
  // A valve is open or closed, or a share in between, and has no other unit than percent.
  if (channel.role.kind === 'valve' && channel.raw_unit !== '%') return (raw) => raw;
  const { raw_unit } = channel;
  toSi(raw_unit, 0);
  return (raw) => toSi(raw_unit, raw);
}

interface Junction {
  /** Index of the channel that measures it, or -1. */
  readonly at: number;
  readonly fixed_degC: number;
}

function junctionOf(unit: Pick<UnitDefinition, 'channels'>, channel: ChannelDefinition): Junction {
  const { cold_junction } = channel;
  if (cold_junction === null || typeof cold_junction === 'number') {
    // Without one the transmitter has an ice point, or its equivalent, of its own.
    return { at: -1, fixed_degC: (cold_junction ?? ZERO_CELSIUS_K) - ZERO_CELSIUS_K };
  }
  const at = unit.channels.findIndex((other) => other.id === cold_junction);
  if (at < 0 || unit.channels[at]?.raw_unit === 'mV') {
    throw new RangeError(
      `cold_junction of channel ${channel.id} must be a channel that measures a temperature, got ${cold_junction}`,
    );
  }
  return { at, fixed_degC: 0 };
}

/**
 * The last step of a scan: thermocouple voltages become temperatures, through their type and the
 * cold junction as measured in the same scan (IEC 60584-1).
 *
 * @param unit the unit, whose channels give type and cold junction
 * @returns null where no channel is in mV; else a function that changes values, in the order of
 *          unit.channels, in place: mV -> K. A voltage outside its type's range and one whose cold
 *          junction is missing or out of range become NaN.
 * @throws RangeError for mV without a type, and for a cold junction that is no temperature channel
 *         of the unit
 */
export function voltageFinish(
  unit: Pick<UnitDefinition, 'channels'>,
): ((values: Float64Array) => void) | null {
  const voltages = unit.channels.flatMap((channel, i) => {
    if (channel.raw_unit !== 'mV') return [];
    const type = channel.thermocouple_type;
    if (type === null) {
      throw new RangeError(
        `thermocouple_type of channel ${channel.id} must be given for mV, got null`,
      );
    }
    return [{ i, type, junction: junctionOf(unit, channel) }];
  });
  if (voltages.length === 0) return null;
  return (values) => {
    for (const { i, type, junction } of voltages) {
      const { at, fixed_degC } = junction;
      const cold_degC = at < 0 ? fixed_degC : (values[at] as number) - ZERO_CELSIUS_K;
      // A reason in words instead of a number is a bad reading: out of range, or a missing part.
      const read_degC = celsiusFromMillivolt(type, values[i] as number, cold_degC);
      values[i] = typeof read_degC === 'number' ? read_degC + ZERO_CELSIUS_K : Number.NaN;
    }
  };
}
