import type { PlantGeometry, RawUnit } from './geometry.js';
import type { PlantTruth, ScanReadings } from './truth.js';

/** Columns of a recording after `time`: thermocouples in the order of the strings, then the other channels. */
export function columnsOf(geometry: PlantGeometry): string[] {
  return [
    ...geometry.stores.flatMap((s) => s.strings.flatMap((t) => t.thermocouples.map((c) => c.id))),
    ...geometry.channels.map((c) => c.id),
  ];
}

export function headerOf(geometry: PlantGeometry): string {
  return ['time', ...columnsOf(geometry)].join(',');
}

/** One row: ISO 8601 UTC, then raw values with six significant digits; an empty field is missing. */
export function rowOf(geometry: PlantGeometry, scan: ScanReadings): string {
  const fields = columnsOf(geometry).map((id) => {
    const si = scan.readings[id];
    if (si === undefined || Number.isNaN(si)) return '';
    const raw = geometry.raw_units[id];
    return String(Number(rawOf(raw, si, scan.readings).toPrecision(6)));
  });
  return [isoOf(scan.time_s), ...fields].join(',');
}

function rawOf(raw: RawUnit | undefined, si: number, readings: ScanReadings['readings']): number {
  if (raw === undefined) return si;
  return typeof raw === 'function' ? raw(si, readings) : si * raw.scale + raw.offset;
}

export function isoOf(time_s: number): string {
  return new Date(Math.round(time_s * 1000)).toISOString();
}

/** One line of a truth file; times as in the recording. */
export function truthLineOf(truth: PlantTruth, hours?: Readonly<Record<string, unknown>>): string {
  const { time_s, ...rest } = truth;
  return JSON.stringify({ time: isoOf(time_s), ...rest, ...(hours ? { hours } : {}) });
}
