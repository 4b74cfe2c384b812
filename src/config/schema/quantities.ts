import { type Dimension, dimensionOf, RAW_UNITS, type RawUnit } from '../../core/units.js';

/** Units in which a channel may deliver what it measures; the table is the core's. */
function unitsOf(dimension: Dimension): readonly RawUnit[] {
  return RAW_UNITS.filter((unit) => dimensionOf(unit) === dimension);
}

export const TEMPERATURE_UNITS = unitsOf('temperature');
export const FLOW_UNITS = unitsOf('flow');
export const POWER_UNITS = unitsOf('power');
export const PRESSURE_UNITS = unitsOf('pressure');
export const VALVE_UNITS = unitsOf('valve');
export { THERMOCOUPLE_TYPES } from '../../core/thermocouple/its90.js';
