import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import type { RecordedUnit } from '../../../src/adapters/recording/columns.js';
import { RecordingReader } from '../../../src/adapters/recording/reader.js';
import type { ChannelDefinition, ChannelRole } from '../../../src/core/definitions.js';
import type { Scan } from '../../../src/core/scan/scan.js';
import { temporaryFolder } from '../../support/folders.js';

/** A channel that brings a value with every scan. */
export function channel(
  id: string,
  role: ChannelRole,
  raw_unit: string,
  more: Partial<ChannelDefinition> = {},
): ChannelDefinition {
  return {
    id,
    role,
    raw_unit,
    reporting: { kind: 'periodic' },
    thermocouple_type: null,
    cold_junction: null,
    ...more,
  };
}

export function thermocouple(
  id: string,
  more: Partial<ChannelDefinition> = {},
  raw_unit = 'degC',
): ChannelDefinition {
  return channel(id, { kind: 'thermocouple', store: 'hot', string: 'axis' }, raw_unit, more);
}

/** Two thermocouples, flow, mode and power: enough for everything that a recording may do. */
export const SMALL: RecordedUnit = {
  id: 'U1',
  channels: [
    thermocouple('T1'),
    thermocouple('T2'),
    channel('flow', { kind: 'flow', sense: 'signed' }, 't/h'),
    channel('mode', { kind: 'mode' }, 'mode'),
    channel('power', { kind: 'power' }, 'MW'),
  ],
};

export function writeText(text: string | Buffer): string {
  const path = join(temporaryFolder('recording'), 'run.csv');
  writeFileSync(path, text);
  return path;
}

export interface Read {
  readonly reader: RecordingReader;
  readonly scans: Scan[];
  readonly fault: unknown;
}

/** Reads a text as a recording to its end or its first fault. */
export async function read(
  text: string | Buffer,
  unit: RecordedUnit = SMALL,
  options: ConstructorParameters<typeof RecordingReader>[2] = {},
): Promise<Read> {
  const reader = new RecordingReader(writeText(text), unit, options);
  const scans: Scan[] = [];
  try {
    for await (const batch of reader.batches()) scans.push(...batch);
  } catch (fault) {
    return { reader, scans, fault };
  }
  return { reader, scans, fault: null };
}
