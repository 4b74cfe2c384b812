/** raw = SI / factor - offset, for the units in which a configuration may record a channel. */
const UNITS: Readonly<Record<string, readonly [factor: number, offset: number]>> = {
  K: [1, 0],
  degC: [1, 273.15],
  degF: [5 / 9, 459.67],
  'kg/s': [1, 0],
  'g/s': [1e-3, 0],
  'kg/min': [1 / 60, 0],
  'kg/h': [1 / 3600, 0],
  't/h': [1 / 3.6, 0],
  W: [1, 0],
  kW: [1e3, 0],
  MW: [1e6, 0],
  Pa: [1, 0],
  hPa: [100, 0],
  mbar: [100, 0],
  kPa: [1e3, 0],
  bar: [1e5, 0],
  MPa: [1e6, 0],
  mode: [1, 0],
  open: [1, 0],
  '1': [1, 0],
  '%': [0.01, 0],
};

/** Reading of the demonstration plant in the raw unit of its channel, to six significant digits. */
export function toRaw(channelId: string, unit: string, si: number): number {
  const known = UNITS[unit];
  if (!known) {
    throw new RangeError(
      `channel ${channelId}: the demonstration plant has no readings in ${unit}; it knows ${Object.keys(UNITS).join(', ')}`,
    );
  }
  return Number((si / known[0] - known[1]).toPrecision(6));
}
