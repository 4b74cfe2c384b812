import type { UnitDefinition } from '../../src/core/definitions.js';
import type { Scan } from '../../src/core/scan/scan.js';
import type { ScanReadings } from '../plant/truth.js';

/** A scan of the finer plant as the core takes it; NaN where the plant gives no reading. */
export function unitScan(unit: UnitDefinition, { time_s, readings }: ScanReadings): Scan {
  const values = Float64Array.from(unit.channels, ({ id }) => readings[id] ?? Number.NaN);
  return { time_ms: Math.round(time_s * 1000), values, held: new Uint8Array(values.length) };
}

/** A scan without any reading. */
export function emptyScan(unit: UnitDefinition, time_ms: number): Scan {
  const { length } = unit.channels;
  return {
    time_ms,
    values: new Float64Array(length).fill(Number.NaN),
    held: new Uint8Array(length),
  };
}
