import { fromSi } from '../core/units.js';

/**
 * Reading of the demonstration plant in the raw unit of its channel, to six significant digits.
 * @throws RangeError for mV: the plant knows temperatures, not voltages of a thermocouple
 */
export function toRaw(channelId: string, unit: string, si: number): number {
  if (unit === 'mV') {
    throw new RangeError(
      `channel ${channelId}: the demonstration plant gives temperatures, not mV; record it in degC`,
    );
  }
  return Number(fromSi(unit, si).toPrecision(6));
}
