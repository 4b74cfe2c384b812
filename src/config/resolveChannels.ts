import type { ChannelDefinition, ChannelRole, Reporting } from '../core/definitions.js';
import { differenceToSi, ZERO_CELSIUS_K } from '../core/units.js';
import { expandString } from './expand.js';
import type { ChannelBlock } from './schema/channels.js';
import type { UnitBlock } from './schema/site.js';

/** All channels of a unit, thermocouples first, in the order of the file. */
export function resolveChannels(unit: UnitBlock): ChannelDefinition[] {
  const thermocouples = unit.stores.flatMap((store) =>
    store.strings.flatMap((string) =>
      expandString(unit.id, store, string, '').ids.map(
        (id): ChannelDefinition => ({
          id,
          role: { kind: 'thermocouple', store: store.id, string: string.id },
          reporting: reportingOf(string, string.unit),
          ...rawOf(string),
        }),
      ),
    ),
  );
  return [...thermocouples, ...unit.channels.map(resolveChannel)];
}

function resolveChannel(block: ChannelBlock): ChannelDefinition {
  const unit = 'unit' in block ? block.unit : 'mode';
  return {
    id: block.id,
    role: roleOf(block),
    reporting: reportingOf(block, unit),
    ...('thermocouple_type' in block || unit === 'mV'
      ? rawOf(block as Parameters<typeof rawOf>[0])
      : { raw_unit: unit, thermocouple_type: null, cold_junction: null }),
  };
}

function roleOf(block: ChannelBlock): ChannelRole {
  switch (block.measures) {
    case 'flow':
      return { kind: 'flow', sense: block.sense };
    case 'gas_temperature':
      return { kind: 'gas_temperature', store: block.store, end: block.end };
    case 'valve':
      return { kind: 'valve', opens: block.opens };
    case 'pressure':
    case 'pressure_drop':
      return { kind: block.measures, store: block.store };
    case 'shell_temperature':
      return { kind: 'shell_temperature', store: block.store, position_m: block.position_m };
    case 'cold_junction':
      return { kind: 'cold_junction', group: block.group };
    default:
      return { kind: block.measures };
  }
}

function rawOf(block: {
  unit: string;
  thermocouple_type?: 'K' | 'N' | 'T' | 'J' | undefined;
  cold_junction?: string | undefined;
  cold_junction_degC?: number | undefined;
}): Pick<ChannelDefinition, 'raw_unit' | 'thermocouple_type' | 'cold_junction'> {
  const fixed = block.cold_junction_degC;
  return {
    raw_unit: block.unit,
    thermocouple_type: block.thermocouple_type ?? null,
    cold_junction: block.cold_junction ?? (fixed === undefined ? null : fixed + ZERO_CELSIUS_K),
  };
}

/** Silence of a metric means no change as long as its edge node lives, whose death is told. */
const SPARKPLUG_SILENCE_S = 86_400;

function reportingOf(
  { reporting: block, payload }: Pick<ChannelBlock, 'reporting'> & { payload: string },
  unit: string,
): Reporting {
  if (block === undefined && payload === 'sparkplug') {
    return { kind: 'by_exception', deadband: 0, longest_silence_s: SPARKPLUG_SILENCE_S };
  }
  if (block === undefined || block.kind === 'periodic') return { kind: 'periodic' };
  return {
    kind: 'by_exception',
    // The deadband of a raw voltage is stated in degC.
    deadband: unit === 'mV' ? block.deadband : differenceToSi(unit, block.deadband),
    longest_silence_s: block.longest_silence_s,
  };
}
