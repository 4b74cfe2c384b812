/** Figures in words. A missing figure is a dash, never a zero. */

export const DASH = '–';
const MINUS = '−';

export function fixed(value: number | null | undefined, digits: number): string {
  if (value === null || value === undefined || !Number.isFinite(value)) return DASH;
  const text = Math.abs(value).toFixed(digits);
  // -0.004 with two digits is 0.00, not minus nothing.
  return value < 0 && Number(text) !== 0 ? MINUS + text : text;
}

/** A value with its sigma; one too small for the digits is rounded up to the last, never `0.00`. */
export function withSigma(
  value: number | null | undefined,
  sigma: number | null | undefined,
  digits: number,
): string {
  const text = fixed(value, digits);
  if (text === DASH || sigma === null || sigma === undefined) return text;
  const least = 10 ** -digits;
  return `${text} ± ${fixed(sigma > 0 ? Math.max(sigma, least) : sigma, digits)}`;
}

export function percent(share: number | null | undefined, digits = 1): string {
  return share === null || share === undefined ? DASH : fixed(share * 100, digits);
}

/** A power as short as it can be said exactly: 2, 1.85. */
export function power(power_MW: number): string {
  return String(Math.round(power_MW * 1000) / 1000);
}

const two = (value: number) => String(value).padStart(2, '0');

/**
 * Which way a power goes, in a word, beside its size: what stands below zero on one sheet would stand
 * above it on another.
 *
 * @param power_MW above 0 while the unit draws, as it is metered
 */
export const powerWay = (power_MW: number | null | undefined): string =>
  wayOf(power_MW, 'drawn', 'delivered');

/** Which way gas flows, in words. */
export const flowWay = (flow_kg_s: number | null | undefined): string =>
  wayOf(flow_kg_s, 'charging way', 'discharging way');

function wayOf(value: number | null | undefined, above: string, below: string): string {
  if (value === null || value === undefined || value === 0) return '';
  return value > 0 ? above : below;
}

/** 4.95 h -> `4 h 57 min`. */
export function hoursText(hours: number | null | undefined): string {
  if (hours === null || hours === undefined || !Number.isFinite(hours)) return DASH;
  const minutes = Math.round(hours * 60);
  if (minutes < 60) return `${minutes} min`;
  return `${Math.floor(minutes / 60)} h ${two(minutes % 60)} min`;
}

/** An age, rounded down so that it never says more than it is: `4 s`, `2 min 10 s`, `3 h 05 min`. */
export function ageText(age_s: number | null): string {
  if (age_s === null) return DASH;
  const seconds = Math.max(0, Math.floor(age_s));
  if (seconds < 60) return `${seconds} s`;
  if (seconds < 3600) return `${Math.floor(seconds / 60)} min ${two(seconds % 60)} s`;
  const minutes = Math.floor(seconds / 60);
  if (minutes < 48 * 60) return `${Math.floor(minutes / 60)} h ${two(minutes % 60)} min`;
  const hours = Math.floor(minutes / 60);
  return `${Math.floor(hours / 24)} d ${hours % 24} h`;
}

/** Time of day where this browser stands. */
export function clock(time: string | number): string {
  const at = new Date(time);
  return `${two(at.getHours())}:${two(at.getMinutes())}:${two(at.getSeconds())}`;
}

/** With the date, ISO order. */
export function dateClock(time: string | number): string {
  const at = new Date(time);
  return `${at.getFullYear()}-${two(at.getMonth() + 1)}-${two(at.getDate())} ${clock(time)}`;
}

export function zoneText(at: Date): string {
  const minutes = -at.getTimezoneOffset();
  if (minutes === 0) return 'UTC';
  const sign = minutes < 0 ? MINUS : '+';
  const size = Math.abs(minutes);
  return `UTC${sign}${two(Math.floor(size / 60))}:${two(size % 60)}`;
}

export const MODE_WORDS = {
  charge: 'charging',
  discharge: 'discharging',
  stand: 'standing',
} as const;

export const END_WORDS = {
  hot_outlet: 'hot outlet too cool',
  cold_outlet: 'cold outlet too warm',
  flow: 'greatest flow reached',
  pressure_drop: 'greatest pressure drop reached',
  empty: 'store empty',
} as const;

export const LIMIT_WORDS = {
  start_up: 'it has to start first',
  change_over: 'it has to turn first',
  below_least_power: 'below its least power',
  above_greatest_power: 'above its greatest power',
  connection: 'the connection lets through less',
  outage: 'an outage is planned',
} as const;

export const REASON_WORDS = {
  uniform: 'no front: the bed is uniform',
  no_half_crossing: 'no front: half the range is not crossed within the bed',
  not_started: 'no front yet',
} as const;

export const QUALITY_WORDS = {
  good: 'good',
  degraded: 'degraded: some readings are left out',
  blind: 'blind: prediction only',
  stale: 'stale: no new readings',
} as const;

/** A message's first sentence, and what follows it; its signs are those of the page, not of a log. */
export function parted(text: string): [string, string] {
  const message = text.replace(/(?<=^|[\s(])-(?=\d)/g, MINUS).replaceAll(' degC', ' °C');
  const end = /[.!?] (?=[A-Z])/.exec(message);
  if (end === null) return [message, ''];
  return [message.slice(0, end.index + 1), message.slice(end.index + 2)];
}
