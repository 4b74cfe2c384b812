/** What a raw value measures, so that the configuration can hold a unit against a channel's role. */
export const DIMENSIONS = [
  'temperature',
  'voltage',
  'flow',
  'power',
  'pressure',
  'mode',
  'valve',
] as const;
export type Dimension = (typeof DIMENSIONS)[number];

interface Conversion {
  readonly dimension: Dimension;
  /** SI = (raw + offset) * factor. */
  readonly factor: number;
  readonly offset: number;
}

function linear(dimension: Dimension, factor: number, offset = 0): Conversion {
  return { dimension, factor, offset };
}

const HOUR_S = 3600;
/** 0 degC in kelvin, exact by the definition of the Celsius scale (BIPM, SI Brochure). */
export const ZERO_CELSIUS_K = 273.15;
/** 0 degF in degF below 0 K: degF = K * 1.8 - 459.67, exact. */
const ZERO_FAHRENHEIT_R = 459.67;

/**
 * Units of raw values at the edges, with their exact factor to SI. `mV` is not converted here: a
 * thermocouple's voltage needs its type and its cold junction (core/thermocouple).
 */
const CONVERSIONS = {
  K: linear('temperature', 1),
  degC: linear('temperature', 1, ZERO_CELSIUS_K),
  degF: linear('temperature', 5 / 9, ZERO_FAHRENHEIT_R),
  mV: linear('voltage', 1),
  'kg/s': linear('flow', 1),
  'g/s': linear('flow', 1e-3),
  'kg/min': linear('flow', 1 / 60),
  'kg/h': linear('flow', 1 / HOUR_S),
  't/h': linear('flow', 1000 / HOUR_S),
  W: linear('power', 1),
  kW: linear('power', 1e3),
  MW: linear('power', 1e6),
  Pa: linear('pressure', 1),
  hPa: linear('pressure', 100),
  mbar: linear('pressure', 100),
  kPa: linear('pressure', 1e3),
  bar: linear('pressure', 1e5),
  MPa: linear('pressure', 1e6),
  /** +1 or `charge`, 0 or `stand`, -1 or `discharge`. */
  mode: linear('mode', 1),
  /** 1, `open` or `true`; 0, `closed` or `false`. */
  open: linear('valve', 1),
  /** Percent open. */
  '%': linear('valve', 0.01),
} as const satisfies Readonly<Record<string, Conversion>>;
export type RawUnit = keyof typeof CONVERSIONS;

/** All unit names, in the order of the table. */
export const RAW_UNITS = Object.keys(CONVERSIONS) as RawUnit[];

function conversion(unit: string): Conversion {
  if (!Object.hasOwn(CONVERSIONS, unit)) {
    throw new RangeError(
      `unit must be one of ${RAW_UNITS.join(', ')}, got ${JSON.stringify(unit)}`,
    );
  }
  return CONVERSIONS[unit as RawUnit];
}

/** What a unit measures; RangeError for an unknown one. */
export function dimensionOf(unit: string): Dimension {
  return conversion(unit).dimension;
}

/**
 * A raw value in SI: SI = (raw + offset) * factor.
 * @param unit name out of RAW_UNITS; RangeError for an unknown one
 * @param value raw value in that unit; NaN stays NaN
 * @returns K, mV (as it is), kg/s, W, Pa; +1/0/-1 for a mode; 0..1 for a valve
 */
export function toSi(unit: string, value: number): number {
  const { factor, offset } = conversion(unit);
  return (value + offset) * factor;
}

/**
 * The raw value of an SI value: raw = SI / factor - offset; the inverse of toSi to rounding.
 * @param unit name out of RAW_UNITS; RangeError for an unknown one
 */
export function fromSi(unit: string, value: number): number {
  const { factor, offset } = conversion(unit);
  return value / factor - offset;
}

/**
 * A difference of raw values in SI, as for a deadband: no offset of the zero point.
 * @param unit name out of RAW_UNITS; RangeError for an unknown one
 */
export function differenceToSi(unit: string, value: number): number {
  return value * conversion(unit).factor;
}
