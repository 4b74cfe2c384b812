import { parseTime } from '../adapters/recording/time.js';
import { RockhourError } from '../errors.js';

const UNITS_S: Readonly<Record<string, number>> = { s: 1, min: 60, h: 3600, d: 86400 };

function wrong(option: string, text: string, expected: string): RockhourError {
  return new RockhourError('USAGE', `${option} is ${JSON.stringify(text)}; expected ${expected}`);
}

/** A span of time on the command line: `90s`, `30min`, `2h`, `1d`, or seconds. In seconds, above 0. */
export function parseDuration_s(option: string, text: string): number {
  const match = /^(\d+(?:\.\d+)?)\s*(s|min|h|d)?$/.exec(text.trim());
  const span_s = Number(match?.[1]) * (UNITS_S[match?.[2] ?? 's'] ?? Number.NaN);
  if (!(span_s > 0)) throw wrong(option, text, 'a time span such as 90s, 30min, 2h or 1d');
  return span_s;
}

/** Powers on the command line in MW, `1.2,1.8`; in watts, each above 0. */
export function parsePowers_W(option: string, text: string): number[] {
  const parts = text.split(',').map((part) => part.trim());
  const powers_W = parts.map((part) => (part === '' ? Number.NaN : Number(part) * 1e6));
  if (!powers_W.every((power) => power > 0 && Number.isFinite(power))) {
    throw wrong(option, text, 'powers in MW above 0, separated by commas, such as 1.2,1.8');
  }
  return powers_W;
}

/** A point in time on the command line, as in a recording; in ms since 1970. */
export function parsePoint_ms(option: string, text: string): number {
  const time_ms = parseTime(text);
  if (Number.isNaN(time_ms)) {
    throw wrong(option, text, 'ISO 8601 with an offset (2025-03-01T06:00:00Z), or seconds');
  }
  return time_ms;
}
