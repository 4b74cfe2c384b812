import { describe, expect, it } from 'vitest';
import type { Scan } from '../../../src/core/scan/scan.js';
import {
  advance,
  restoreUnit,
  saveUnit,
  startUnit,
  type UnitState,
} from '../../../src/core/unit.js';
import type { CycleRecord } from '../../../src/core/watch/cycleRecord.js';
import { DEMO_GEOMETRY } from '../../plant/demoGeometry.js';
import { createTruth, type PlantTruth, type Segment } from '../../plant/truth.js';
import { demoUnit, H } from '../../support/truthRun.js';
import { unitScan } from '../../support/unitScans.js';

const PERIOD_S = 300;
/** A day with two changes of load, a pause within a charge, and a change-over without a rest. */
const DAY: readonly Segment[] = [
  { mode: 'stand', duration_s: 1 * H },
  { mode: 'charge', duration_s: 2 * H, power_W: 2.4e6 },
  { mode: 'stand', duration_s: 1 * PERIOD_S },
  { mode: 'charge', duration_s: 2 * H, power_W: 1.6e6 },
  { mode: 'stand', duration_s: 3 * H },
  { mode: 'discharge', duration_s: 1.5 * H, power_W: 1.2e6 },
  { mode: 'discharge', duration_s: 1 * H, power_W: 1.7e6 },
  { mode: 'charge', duration_s: 2 * H, power_W: 2.2e6 },
  { mode: 'stand', duration_s: 1.5 * H },
];
const KINDS = ['stand', 'charge', 'stand', 'discharge', 'charge'];
/** Hours of the edges, and electricity in between [MWh_el]. */
const EDGES_H = [0, 1, 5 + 1 / 12, 8 + 1 / 12, 10.5 + 1 / 12];
const ENERGY = [null, 8, null, 1.8 + 1.7, 4.4];

const demo = demoUnit();
const unit = {
  ...demo,
  scan_period_s: PERIOD_S,
  estimator: { ...demo.estimator, cells: 50 },
};

/** What the plant read and what was true, scan by scan. */
function plantDay(): { scans: Scan[]; truths: PlantTruth[] } {
  const plant = createTruth({
    geometry: { ...DEMO_GEOMETRY, scan_period_s: PERIOD_S },
    resolution: { cells: 50, shells: 2 },
    initial: { hot: { front_m: 2.5, width_m: 0.6 }, cold: { front_m: 2.5, width_m: 0.6 } },
    seed: 3,
  });
  const scans: Scan[] = [];
  const truths: PlantTruth[] = [];
  plant.run(DAY, (readings, truth) => {
    scans.push(unitScan(unit, readings));
    truths.push(truth);
  });
  return { scans, truths };
}

/** Records of scans and the log after them; changes the state. */
function logOf(scans: readonly Scan[], state: UnitState) {
  const records: CycleRecord[] = [];
  for (const scan of scans) {
    const { cycle } = advance(unit, state, scan, { hours_at_W: [], profile: false });
    if (cycle) records.push(cycle);
  }
  return { records, log: state.cycle };
}

/** Scans after which the state is saved: amid the pause of a charge, when it is open what it is. */
const SAVED_AT = 12 + 24 + 1;

describe('cycles of the finer plant', () => {
  const { scans, truths } = plantDay();
  const state = startUnit(unit);
  const first = logOf(scans.slice(0, SAVED_AT), state);
  const saved = saveUnit(state);
  const rest = logOf(scans.slice(SAVED_AT), state);
  const records = [...first.records, ...rest.records];
  const time_s = (iso: string) => Date.parse(iso) / 1000;
  const at = (iso: string) =>
    truths.reduce((a, b) =>
      Math.abs(b.time_s - time_s(iso)) < Math.abs(a.time_s - time_s(iso)) ? b : a,
    );

  it('are the runs of its day, each edge within a scan', () => {
    expect(records.map(({ kind }) => kind)).toEqual(KINDS);
    const begin_s = truths[0]!.time_s - PERIOD_S;
    records.forEach(({ from }, i) => {
      const off_s = time_s(from) - begin_s - EDGES_H[i]! * H;
      expect(Math.abs(off_s)).toBeLessThanOrEqual(PERIOD_S);
    });
    expect(records.map(({ incomplete }) => incomplete)).toEqual([['began_before'], [], [], [], []]);
  });

  it('electricity as commanded, within a scan at either edge and the class of the power meter', () => {
    records.forEach(({ drawn_MWh_el, delivered_MWh_el, kind }, i) => {
      const energy = kind === 'discharge' ? delivered_MWh_el! : drawn_MWh_el!;
      const truth = ENERGY[i] ?? null;
      if (truth === null) return;
      const edges = (2.4 * PERIOD_S) / H;
      expect(Math.abs(energy - truth)).toBeLessThan(edges + 0.01 * truth);
      expect(kind === 'discharge' ? drawn_MWh_el! : delivered_MWh_el!).toBeLessThan(edges);
    });
  });

  it('stored heat within three of its sigmas, carried heat within meter and gas thermometers', () => {
    let worst = 0;
    for (const record of records) {
      for (const [id, run] of Object.entries(record.stores)) {
        const before = at(record.from).stores[id]!;
        const after = at(record.to).stores[id]!;
        worst = Math.max(
          worst,
          Math.abs(run.stored_to_MWh_th - after.stored_MWh_th) / run.stored_sigma_MWh_th,
        );
        if (run.carried_MWh_th === null) {
          expect(record.kind).toBe('stand');
          continue;
        }
        // Losses are a per cent of what is carried; half a scan at each edge.
        const truth = after.stored_MWh_th - before.stored_MWh_th;
        expect(Math.sign(run.carried_MWh_th)).toBe(record.kind === 'charge' ? 1 : -1);
        const edges = (Math.abs(truth) * PERIOD_S) / (2 * H);
        expect(Math.abs(run.carried_MWh_th - truth)).toBeLessThan(
          3 * 0.015 * Math.abs(truth) + edges + 0.05,
        );
      }
    }
    expect(worst).toBeLessThan(3);
  });

  it('what was told of the discharge at its begin, at the power that it ended with', () => {
    const { from, to, told } = records[3]!;
    expect(told).not.toBeNull();
    const after_s = time_s(told!.made) - time_s(from);
    expect(after_s).toBeGreaterThan(0);
    expect(after_s).toBeLessThanOrEqual(4 * PERIOD_S);
    // 1.2 MW for an hour and a half, then 1.7 MW; by the plant's meter.
    expect(Math.abs(told!.power_MW_el / 1.7 - 1)).toBeLessThan(0.02);
    // It was ended by the next charge, long before the store was empty; the firm time is the earlier.
    expect(time_s(told!.end)).toBeGreaterThan(time_s(to));
    expect(time_s(told!.firm_end)).toBeLessThan(time_s(told!.end));
    expect(records.filter((one) => one.told !== null)).toEqual([records[3]]);
  });

  it('round trip of the discharge: what it gave over what the same state of charge had cost', () => {
    const discharge = records[3]!;
    const over = discharge.round_trip_over!;
    const from = at(over.from);
    const to = at(discharge.to);
    for (const id of Object.keys(over.soc_left)) {
      const left = to.stores[id]!.soc - from.stores[id]!.soc;
      expect(Math.abs(left - over.soc_left[id]!)).toBeLessThan(0.02);
    }
    const span = truths.filter((t) => t.time_s > from.time_s && t.time_s <= to.time_s);
    const sum = (sense: 1 | -1) =>
      span.reduce((mwh, t) => mwh + (Math.max(0, sense * t.power_W) * PERIOD_S) / 3.6e9, 0);
    expect(discharge.round_trip!).toBeCloseTo(sum(-1) / sum(1), 1);
    expect(records.map(({ round_trip }) => round_trip !== null)).toEqual(
      KINDS.map((kind) => kind === 'discharge'),
    );
  });

  it('to the bit the same from a state that was saved amid a pause, which was open then', () => {
    expect(saved.state.cycle?.beside).not.toBeNull();
    const again = restoreUnit(unit, saved);
    expect(logOf(scans.slice(SAVED_AT, SAVED_AT + 45), again).records).toEqual(
      rest.records.slice(0, 1),
    );
    // A state of a build without a log begins one.
    const { cycle: _, ...older } = saved.state;
    const begun = restoreUnit(unit, { ...saved, state: older });
    logOf(scans.slice(SAVED_AT, SAVED_AT + 2), begun);
    expect(begun.cycle?.begunBefore).toBe(true);
  });
});
