import { base, cycle, day } from '../base.js';
import { type Figure, figure, median, ownValues, worst } from '../figure.js';
import type { Recording } from '../recording.js';
import type { RowPlan, Runner, Scenario } from '../scenario.js';
import { unitWith } from '../sensorSets.js';
import { runSeries, type Series } from '../series.js';
import { type RowResult, tally } from '../tally.js';
import { columnOf } from '../twins.js';
import {
  FAULT_H,
  FAULT_KINDS,
  type FaultKind,
  type PlannedFault,
  VISIBLE_K,
} from './faultKinds.js';

/** A row for each kind of fault. */
const FAULT_ROWS: readonly RowPlan[] = FAULT_KINDS.map((kind) => ({
  id: kind.id,
  set: 'all',
  errors: 'class',
  words: kind.words,
}));

/**
 * One sound run, and from its state at the moment of the fault one run for each kind.
 * @param end_h how long the faults are followed
 */
const runFaults =
  (end_h: number): Runner =>
  (recording, seed, rows) => {
    const scan = FAULT_H * 60;
    const unit = unitWith('all', 'class');
    const to = end_h * 60;
    const common = { errors: 'class', hours: false, to } as const;
    const healthy = runSeries(unit, recording, { ...common, keep: [scan] });
    const from = { scan, snapshot: healthy.snapshots.get(scan)! };
    return Object.fromEntries(
      rows.map((row) => {
        const kind = FAULT_KINDS.find((k) => k.id === row.id)!;
        const planned = kind.plan(unit, recording, seed);
        const series = runSeries(unit, recording, { ...common, from, faults: [planned.fault] });
        return [row.id, tally(series, seed, judged(kind, planned, series, healthy, recording))];
      }),
    );
  };

function judged(
  kind: FaultKind,
  planned: PlannedFault,
  series: Series,
  healthy: Series,
  recording: Recording,
): Record<string, number | null> {
  const guilty = new Set(planned.sensors);
  const innocent = new Set(
    series.rejections.filter((r) => !guilty.has(r.sensor)).map((r) => r.sensor),
  );
  const known = new Set(healthy.rejections.map((r) => r.sensor));
  let shift = 0;
  let error = 0;
  for (const id of Object.keys(series.stores)) {
    for (let n = series.from; n < series.to; n++) {
      const soc = series.stores[id]!.soc[n]!;
      shift = Math.max(shift, Math.abs(soc - healthy.stores[id]!.soc[n]!));
      error = Math.max(error, Math.abs(soc - recording.truth(`${id}.soc`, n)));
    }
  }
  const visible = visibleAt(kind, planned, series, recording);
  const first = (verdicts: readonly string[] | null) => {
    // A group is named when half of its sensors are, a swap when either is.
    const scans = planned.sensors
      .map((sensor) =>
        series.rejections
          .filter((r) => r.sensor === sensor && (verdicts?.includes(r.verdict) ?? true))
          .reduce((least, r) => Math.min(least, r.from), Number.POSITIVE_INFINITY),
      )
      .sort((a, b) => a - b);
    return scans[planned.sensors.length > 2 ? scans.length >> 1 : 0]!;
  };
  const named = first(kind.named);
  const found = first(null);
  const deadline = visible === null ? null : visible + kind.within_scans;
  const inTime = (n: number) => (deadline === null ? null : n < deadline + 1 ? 1 : 0);
  return {
    'named in time': inTime(named),
    'found in time': inTime(found),
    'named ever': visible === null ? null : Number.isFinite(named) ? 1 : 0,
    'delay min': visible === null || !Number.isFinite(named) ? null : named - visible,
    'wrongly named': [...innocent].filter((s) => !known.has(s)).length,
    shift: 100 * shift,
    error: 100 * error,
  };
}

/** Scan with which the fault can be seen; null where it never can within the run. */
function visibleAt(
  kind: FaultKind,
  planned: PlannedFault,
  series: Series,
  recording: Recording,
): number | null {
  const { from, to, unit } = series;
  if (kind.visible === 'at_once') return from;
  const store = unit.stores.find((s) => s.id === planned.store)!;
  const middle = (store.reference_hot_K + store.reference_cold_K) / 2;
  const [sensor, other] = planned.sensors;
  const sound = (n: number) => recording.reading(columnOf(sensor!, 'class'), n);
  const { fault } = planned;
  const off = (n: number): number => {
    if (fault.kind === 'drift') return (fault.rate_K_h * (n - from)) / 60;
    if (fault.kind === 'reversed') return 2 * (298.15 - sound(n));
    if (fault.kind === 'swapped') return recording.reading(columnOf(other!, 'class'), n) - sound(n);
    throw new RangeError(`no time at which ${fault.kind} becomes visible`);
  };
  for (let n = from; n < to; n++) {
    const seen =
      kind.visible === 'front'
        ? (sound(n) - middle) * (sound(from) - middle) < 0
        : Math.abs(off(n)) > VISIBLE_K;
    if (seen) return n;
  }
  return null;
}

function faultFigures(_: RowPlan, results: readonly RowResult[]): Figure[] {
  const part = (name: string) => {
    const values = ownValues(results, name);
    const hits = values.reduce((a, b) => a + b, 0);
    return {
      value: values.length === 0 ? null : (100 * hits) / values.length,
      note: `${hits} of ${values.length}`,
    };
  };
  const named = part('named in time');
  const found = part('found in time');
  const ever = part('named ever');
  const wrongly = ownValues(results, 'wrongly named').reduce((a, b) => a + b, 0);
  return [
    figure('named in time', named.value, '%', { least: 100, each: true }, named.note),
    figure('  left out in time, by whatever name', found.value, '%', null, found.note),
    figure('  named ever', ever.value, '%', null, ever.note),
    figure('  median from visible to named', median(ownValues(results, 'delay min')), 'min'),
    figure('others wrongly named', wrongly, '', { most: 0, each: true }),
    figure(
      'state of charge against the sound run, worst',
      worst(ownValues(results, 'shift')),
      '%',
      {
        most: 0.5,
        each: true,
      },
    ),
    figure('  against the truth, worst', worst(ownValues(results, 'error')), '%'),
  ];
}

const common = {
  ...base,
  code: 'faults',
  words: 'sensor fault',
  figures: faultFigures,
  hours: false,
  healthy: false,
  goals: 'none',
} as const;

export const FAULTS: Scenario = {
  ...common,
  id: 'faults',
  truth: day('random'),
  rows: FAULT_ROWS,
  // To the end of the first discharge.
  run: runFaults(12.5),
};

const QUICK_KINDS = ['open', 'stuck', 'offset', 'swapped', 'card'];

export const QUICK_FAULTS: Scenario = {
  ...common,
  id: 'quick-faults',
  truth: { id: 'quick-cycle', machine: 'random', segments: cycle, hours_every_min: 120 },
  rows: FAULT_ROWS.filter((r) => QUICK_KINDS.includes(r.id)),
  run: runFaults(7.5),
};
