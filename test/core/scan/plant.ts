import type { ChannelDefinition, UnitDefinition } from '../../../src/core/definitions.js';

/** As much of a unit as scans need: channels a, b, c and, by exception, e. */
export function scanUnit(
  period_s = 30,
  ids: readonly string[] = ['a', 'b', 'c'],
  exceptions: readonly string[] = ['e'],
): UnitDefinition {
  const channel = (id: string, reporting: ChannelDefinition['reporting']): ChannelDefinition => ({
    id,
    role: { kind: 'ambient_temperature' },
    reporting,
    raw_unit: 'K',
    thermocouple_type: null,
    cold_junction: null,
  });
  const channels = [
    ...ids.map((id) => channel(id, { kind: 'periodic' })),
    ...exceptions.map((id) =>
      channel(id, { kind: 'by_exception', deadband: 0.5, longest_silence_s: 120 }),
    ),
  ];
  return { id: 'u', scan_period_s: period_s, channels } as unknown as UnitDefinition;
}
