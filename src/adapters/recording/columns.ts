import type { ChannelDefinition, UnitDefinition } from '../../core/definitions.js';
import { RockhourError } from '../../errors.js';

/** What the reading of a recording needs to know of a unit. */
export type RecordedUnit = Pick<UnitDefinition, 'id' | 'channels'>;

/** Which field of a row belongs to which channel. */
export interface Columns {
  readonly count: number;
  readonly time: number;
  /** For each field the index in unit.channels, or -1. */
  readonly channel: Int32Array;
  readonly names: readonly string[];
  /** Columns that are no channel of the site: ignored. */
  readonly unknown: readonly string[];
  /** Channels of the unit that have no column and are not needed. */
  readonly absent: readonly string[];
}

function isFlow(channel: ChannelDefinition): boolean {
  return channel.role.kind === 'flow';
}

/**
 * Channels without which nothing can be estimated: every thermocouple in a bed, the cold-junction
 * channels that these need, and the flow (of each direction that has a meter) or else the power.
 */
function missingChannels(unit: RecordedUnit, present: ReadonlySet<string>): string[] {
  const needed = new Set<string>();
  for (const channel of unit.channels) {
    if (channel.role.kind !== 'thermocouple') continue;
    needed.add(channel.id);
    if (typeof channel.cold_junction === 'string') needed.add(channel.cold_junction);
  }
  const flows = unit.channels.filter(isFlow).map((channel) => channel.id);
  const powers = unit.channels
    .filter((channel) => channel.role.kind === 'power')
    .map((channel) => channel.id);
  const hasFlow = flows.length > 0 && flows.every((id) => present.has(id));
  const hasPower = powers.some((id) => present.has(id));
  if (!hasFlow && !hasPower) for (const id of flows.length > 0 ? flows : powers) needed.add(id);
  return [...needed].filter((id) => !present.has(id));
}

/** Names with commas, not more than a person reads. */
function listed(names: readonly string[]): string {
  const most = 12;
  const more = names.length - most;
  return more > 1 ? `${names.slice(0, most).join(', ')} and ${more} more` : names.join(', ');
}

/**
 * Reads a header against a unit.
 * @param header names of the columns, in order
 * @param others ids of channels of other units of the site, which are no surprise
 * @throws RockhourError RECORDING_MALFORMED for a repeated name or another separator,
 *         RECORDING_COLUMN_MISSING for a column that is needed
 */
export function readHeader(
  header: readonly string[],
  unit: RecordedUnit,
  others: ReadonlySet<string>,
  path: string,
): Columns {
  const names = header.map((name) => name.trim());
  const repeated = names.find((name, i) => name !== '' && names.indexOf(name) !== i);
  if (repeated !== undefined) {
    throw new RockhourError(
      'RECORDING_MALFORMED',
      `${path}, row 1: the column ${JSON.stringify(repeated)} stands there twice`,
      { advice: 'Each column needs a name of its own.' },
    );
  }
  const time = names.indexOf('time');
  if (time < 0 && names.length === 1 && /[;\t]/.test(names[0] ?? '')) {
    throw new RockhourError(
      'RECORDING_MALFORMED',
      `${path}, row 1: the fields are separated by ${names[0]?.includes(';') ? 'semicolons' : 'tabs'}, not by commas`,
    );
  }
  const index = new Map(unit.channels.map((channel, i) => [channel.id, i]));
  const present = new Set(names.filter((name) => index.has(name)));
  const missing = missingChannels(unit, present);
  if (time < 0) missing.unshift('time');
  if (missing.length > 0) {
    throw new RockhourError(
      'RECORDING_COLUMN_MISSING',
      `${path} has no column ${listed(missing)}, which unit ${unit.id} needs`,
    );
  }
  const known = (name: string) => name === 'time' || index.has(name) || others.has(name);
  return {
    count: names.length,
    time,
    channel: Int32Array.from(names, (name) => index.get(name) ?? -1),
    names,
    // A nameless column is what a comma at the end of the header leaves.
    unknown: names.filter((name) => name !== '' && !known(name)),
    absent: unit.channels.map((channel) => channel.id).filter((id) => !present.has(id)),
  };
}
