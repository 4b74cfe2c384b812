import { parse } from 'yaml';
import {
  channelOf,
  heightsOf,
  type MeasuredPoint,
  meierPoints,
  meierSite,
  sandiaPoints,
  sandiaSite,
} from '../published/measuredStores.js';

/**
 * The measured stores as six units of one site, so that one daemon digests all of them at once.
 * Temperatures are as published (sources in the heads of the fixtures), one channel per digitised
 * height. What is constructed, from the same heads, says so:
 *
 * - flow and gas temperature at the inlet, every minute, in channels named `..._constructed`, and
 *   hence in their columns and topics;
 * - the uniform start of the rock bed ("bed at 30 degC at the start"), in the column `remark`.
 */
export interface MeasuredUnit {
  readonly id: string;
  /** The unit's block of a site file. */
  readonly block: Readonly<Record<string, unknown>>;
  readonly channels: readonly string[];
  readonly rows: readonly MeasuredRow[];
  /** Rows up to here are measured time; two more let the clock of the readings close them. */
  readonly end_s: number;
}

interface MeasuredRow {
  readonly time_s: number;
  readonly values: Readonly<Record<string, number>>;
  readonly remark?: string;
}

export const SALT_HEIGHT_M = 6.1;
/** A scan is closed when readings of two periods on have come. */
const CLOSING_S = 120;
const FLOW = 'flow_constructed';

/** A unit of a published site under another id, with its constructed channels renamed. */
function blockOf(site: string, id: string, inlet: string): Record<string, unknown> {
  const [unit] = (parse(site) as { units: Record<string, unknown>[] }).units;
  const channels = unit!.channels as { id: string }[];
  for (const channel of channels) channel.id = channel.id === 'flow' ? FLOW : inlet;
  return { ...unit, id };
}

function measuredUnit(
  id: string,
  site: string,
  all: readonly MeasuredPoint[],
  inlet: { readonly id: string; readonly degC: number; readonly flow_kg_s: number },
  end_s: number,
  measured: (time_s: number) => Omit<MeasuredRow, 'time_s'>,
): MeasuredUnit {
  const inletId = `${inlet.id}_constructed`;
  const rows: MeasuredRow[] = [];
  for (let time_s = 0; time_s <= end_s + CLOSING_S; time_s += 60) {
    const { values, ...rest } = measured(time_s);
    const constructed = { [FLOW]: inlet.flow_kg_s, [inletId]: inlet.degC };
    rows.push({ time_s, values: { ...constructed, ...values }, ...rest });
  }
  const channels = [FLOW, inletId, ...heightsOf(all).map(channelOf)];
  return { id, block: blockOf(site, id, inletId), channels, rows, end_s };
}

/** The recordings begin at second 0; a clock in 1970 would be one without its date. */
const BEGIN_S = Date.UTC(2026, 0, 1) / 1000;

/** Source time of a second of the recordings [ms since 1970]. */
export const sourceMs = (time_s: number) => (BEGIN_S + time_s) * 1000;

const valuesAt = (points: readonly MeasuredPoint[], time_s: number) =>
  Object.fromEntries(
    points.filter((p) => p.time_s === time_s).map((p) => [channelOf(p.height_m), p.value_degC]),
  );

/** Place of a point among those of its own profile, counted from the bottom. */
export function rankOf(point: MeasuredPoint, points: readonly MeasuredPoint[]): number {
  return points.filter((p) => p.time_s === point.time_s && p.height_m < point.height_m).length;
}

/** Salt thermocline, discharging: 7.0 kg/s of salt at 290 degC from the bottom. */
function saltUnit(id: string, isUsed: (point: MeasuredPoint) => boolean): MeasuredUnit {
  const all = sandiaPoints();
  const used = all.filter(isUsed);
  const inlet = { id: 'T_bottom', degC: 290, flow_kg_s: -7 };
  return measuredUnit(id, sandiaSite(all), all, inlet, 3600, (time_s) => ({
    values: valuesAt(used, time_s),
  }));
}

/** Rock bed, charged from 30 degC: 0.0034 kg/s of air at 545 degC from the top. */
function airUnit(id: string, withSensors: boolean): MeasuredUnit {
  const all = meierPoints();
  const start = Object.fromEntries(heightsOf(all).map((h) => [channelOf(h), 30]));
  const inlet = { id: 'T_in', degC: 545, flow_kg_s: 0.0034 };
  return measuredUnit(id, meierSite(all), all, inlet, 7200, (time_s) =>
    time_s === 0
      ? { values: start, remark: 'temperatures of this row constructed' }
      : { values: withSensors ? valuesAt(all, time_s) : {} },
  );
}

export function measuredUnits(): Record<
  'salt' | 'saltEven' | 'saltOdd' | 'saltStart' | 'air' | 'airStart',
  MeasuredUnit
> {
  const all = sandiaPoints();
  return {
    salt: saltUnit('salt', () => true),
    saltEven: saltUnit('salt_even', (p) => rankOf(p, all) % 2 === 0),
    saltOdd: saltUnit('salt_odd', (p) => rankOf(p, all) % 2 === 1),
    saltStart: saltUnit('salt_start', (p) => p.time_s === 0),
    air: airUnit('air', true),
    airStart: airUnit('air_start', false),
  };
}

/** The rows as a recording for `rockhour replay`. */
export function recordingOf({ channels, rows }: MeasuredUnit): string {
  const lines = rows.map(({ time_s, values, remark }) =>
    [sourceMs(time_s) / 1000, ...channels.map((id) => values[id] ?? ''), remark ?? ''].join(','),
  );
  return `${[['time', ...channels, 'remark'].join(','), ...lines].join('\r\n')}\r\n`;
}
