import type { UnitDefinition } from '../../src/core/definitions.js';
import type { Estimate, StoreEstimate } from '../../src/core/estimate.js';
import {
  advance,
  restoreUnit,
  saveUnit,
  startUnit,
  type UnitSnapshot,
} from '../../src/core/unit.js';
import { applyFaults, type SensorFault } from '../../test/plant/faults.js';
import { StraightLines } from '../../test/score/straightLines.js';
import type { Recording } from './recording.js';
import type { ErrorModel } from './sensorSets.js';
import { lookAt, sound, type Unsound } from './soundState.js';
import { columnOf } from './twins.js';

/** What was estimated of one store, scan by scan; NaN where there is none. */
export interface StoreSeries {
  readonly soc: Float64Array;
  readonly soc_sigma: Float64Array;
  readonly stored: Float64Array;
  readonly stored_sigma: Float64Array;
  readonly fronts: StoreEstimate['fronts'][];
  readonly transfer: Float64Array;
  readonly transfer_sigma: Float64Array;
  /** Flow factors of the strings, in the order of the configuration. */
  readonly flow: Float64Array[];
  readonly line_soc: Float64Array;
}

/** A sensor that was rejected, with its verdict and for which scans [from, to). */
export interface Rejection {
  readonly store: string;
  readonly sensor: string;
  readonly verdict: string;
  readonly from: number;
  to: number;
}

export interface HoursCase {
  readonly scan: number;
  readonly power_W: number;
  readonly truth_h: number;
  readonly p90: number;
  readonly p50: number;
  readonly p10: number;
  /** Straight lines: heat over heat rate. */
  readonly line_h: number;
}

export interface Series {
  readonly unit: UnitDefinition;
  readonly recording: Recording;
  /** First scan that was run, and the one after the last. */
  readonly from: number;
  readonly to: number;
  readonly stores: Readonly<Record<string, StoreSeries>>;
  readonly hours: readonly HoursCase[];
  readonly rejections: readonly Rejection[];
  /** Estimates with a figure that is not a finite number. */
  readonly not_finite: number;
  readonly unsound: Unsound;
  /** States kept, by the scan before which they were. */
  readonly snapshots: ReadonlyMap<number, UnitSnapshot>;
}

/** What reaches the estimator with a scan, SI units; `held` as in Scan. */
export interface Reading {
  readonly values: Float64Array;
  readonly held: Uint8Array;
}

export interface RunOptions {
  readonly errors: ErrorModel;
  readonly faults?: readonly SensorFault[];
  readonly from?: { readonly scan: number; readonly snapshot: UnitSnapshot };
  readonly to?: number;
  /** Scans before which the state is kept in `snapshots`. */
  readonly keep?: readonly number[];
  /** What the estimator takes for the time of a scan is later than in the recording by this [ms]. */
  readonly shift_ms?: number;
  /** What becomes of a reading on its way, called scan by scan; null where there is no scan. */
  readonly through?: (reading: Reading, scan: number) => Reading | null;
  /** Whether hours are asked where the truth knows them. */
  readonly hours: boolean;
  /** Only every so many of those; 1 if absent. */
  readonly hours_every?: number;
}

/** Runs the estimator, and beside it straight lines, over a recording. */
export function runSeries(unit: UnitDefinition, recording: Recording, options: RunOptions): Series {
  const { scans, period_s } = recording.header;
  const from = options.from?.scan ?? 0;
  const to = Math.min(options.to ?? scans, scans);
  const state = options.from ? restoreUnit(unit, options.from.snapshot) : startUnit(unit);
  const lines = new StraightLines(unit);
  const stores = Object.fromEntries(
    unit.stores.map((s) => [s.id, emptyStore(scans, s.strings.length)]),
  );
  const read = readerOf(unit, recording, options);
  const known = new Map<number, Recording['header']['hours'][number][]>();
  const every = options.hours_every ?? 1;
  for (const [i, h] of recording.header.hours.entries()) {
    if ((i + 1) % every !== 0) continue;
    known.set(h.scan, [...(known.get(h.scan) ?? []), h]);
  }
  const hours: HoursCase[] = [];
  const open = new Map<string, Rejection>();
  const rejections: Rejection[] = [];
  let notFinite = 0;
  const unsound = sound();
  const snapshots = new Map<number, UnitSnapshot>();
  let last = from - 1;
  for (let n = from; n < to; n++) {
    if (options.keep?.includes(n)) snapshots.set(n, saveUnit(state));
    const found = read(n);
    const plain = { values: found, held: new Uint8Array(found.length) };
    const reading = options.through ? options.through(plain, n) : plain;
    if (reading === null) continue;
    const asked = options.hours ? (known.get(n) ?? []) : [];
    const scan = { time_ms: recording.time_ms(n) + (options.shift_ms ?? 0), ...reading };
    const powers = asked.map((a) => a.power_W);
    const { estimate } = advance(unit, state, scan, { hours_at_W: powers, profile: false });
    lines.take(reading.values, (n - last) * period_s);
    const before = last;
    last = n;
    lookAt(state, unsound);
    if (!finite(estimate)) notFinite++;
    for (const [id, store] of Object.entries(estimate.stores)) {
      note(stores[id]!, n, store, lines.soc(id));
      noteRejections(open, rejections, id, store, n, before);
    }
    asked.forEach((a, i) => {
      const { p90, p50, p10 } = estimate.dispatch![i]!.hours;
      const line_h = lines.hours(a.power_W);
      hours.push({ scan: n, power_W: a.power_W, truth_h: a.hours, p90, p50, p10, line_h });
    });
  }
  return {
    unit,
    recording,
    from,
    to,
    stores,
    hours,
    rejections,
    not_finite: notFinite,
    unsound,
    snapshots,
  };
}

/** Readings of the unit's channels at a scan, with the faults of the run. */
function readerOf(
  unit: UnitDefinition,
  recording: Recording,
  options: RunOptions,
): (scan: number) => Float64Array {
  const columns = unit.channels.map((c) =>
    c.role.kind === 'thermocouple' ? columnOf(c.id, options.errors) : c.id,
  );
  const { faults } = options;
  const sound = (n: number) => Float64Array.from(columns, (id) => recording.reading(id, n));
  if (!faults) return sound;
  const groupOf = new Map(
    unit.stores.flatMap((s) =>
      s.strings.flatMap((t) => t.thermocouples.map((c) => [c.id, c.group] as const)),
    ),
  );
  const flows = unit.channels.filter((c) => c.role.kind === 'flow').map((c) => c.id);
  const stuck = new Map<string, number>();
  return (n) => {
    const values = sound(n);
    const readings = Object.fromEntries(unit.channels.map((c, i) => [c.id, values[i]!]));
    const elapsed_s = (n + 1) * recording.header.period_s;
    applyFaults(readings, faults, elapsed_s, stuck, groupOf, flows);
    return Float64Array.from(unit.channels, (c) => readings[c.id]!);
  };
}

function emptyStore(scans: number, strings: number): StoreSeries {
  const empty = () => new Float64Array(scans).fill(Number.NaN);
  return {
    soc: empty(),
    soc_sigma: empty(),
    stored: empty(),
    stored_sigma: empty(),
    fronts: [],
    transfer: empty(),
    transfer_sigma: empty(),
    flow: Array.from({ length: strings }, empty),
    line_soc: empty(),
  };
}

function note(into: StoreSeries, n: number, store: StoreEstimate, lineSoc: number): void {
  into.soc[n] = store.soc;
  into.soc_sigma[n] = store.soc_sigma;
  into.stored[n] = store.stored_MWh_th;
  into.stored_sigma[n] = store.stored_sigma_MWh_th;
  into.fronts[n] = store.fronts;
  into.transfer[n] = store.heat_transfer_factor;
  into.transfer_sigma[n] = store.heat_transfer_factor_sigma;
  store.strings.forEach((string, k) => {
    into.flow[k]![n] = string.flow_factor;
  });
  into.line_soc[n] = lineSoc;
}

function noteRejections(
  open: Map<string, Rejection>,
  all: Rejection[],
  id: string,
  store: StoreEstimate,
  n: number,
  before: number,
): void {
  for (const { id: sensor, verdict } of store.sensors.rejected) {
    const key = `${sensor} ${verdict}`;
    const known = open.get(key);
    if (known && known.to === before + 1) known.to = n + 1;
    else {
      const rejection = { store: id, sensor, verdict, from: n, to: n + 1 };
      open.set(key, rejection);
      all.push(rejection);
    }
  }
}

function finite(estimate: Estimate): boolean {
  if (!Number.isFinite(estimate.state_of_charge)) return false;
  const hours = estimate.dispatch?.flatMap((d) => Object.values(d.hours)) ?? [];
  if (!hours.every(Number.isFinite)) return false;
  return Object.values(estimate.stores).every((s) =>
    [
      s.soc,
      s.soc_sigma,
      s.stored_MWh_th,
      s.stored_sigma_MWh_th,
      s.heat_transfer_factor,
      ...s.strings.map((t) => t.flow_factor),
    ].every(Number.isFinite),
  );
}
