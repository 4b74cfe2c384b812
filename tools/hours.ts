/**
 * How far the hours of the estimator's own physics lie from those of the finer plant when it is
 * given the true state: what is left is the error of the rollout, apart from that of the estimate.
 */

import type { Gaussian } from '../src/core/dispatch/gaussian.js';
import { centralHours } from '../src/core/dispatch/hours.js';
import type { StoreModel } from '../src/core/track/storeTracker.js';
import { startUnit } from '../src/core/unit.js';
import { unitModel } from '../src/core/unitModel.js';
import { DEMO_GEOMETRY } from '../test/plant/demoGeometry.js';
import type { PlantDraw } from '../test/plant/draws.js';
import { scheduleFor } from '../test/plant/schedules.js';
import type { SimulatedStore } from '../test/plant/simulatedStore.js';
import { createTruth } from '../test/plant/truth.js';
import { setTrueState } from './hours/trueState.js';
import { unitWith } from './score/sensorSets.js';

const H = 3600;
const geometry = { ...DEMO_GEOMETRY, scan_period_s: 60 };
const power = 0.6 * geometry.rated_power_W;

type Keep = (keyof PlantDraw['stores'][string])[] | 'all' | 'none';
const CASES: Record<
  string,
  { keep: Keep; ambient?: boolean; machine?: 'known' | 'random'; told?: boolean }
> = {
  nominal: { keep: 'none' },
  capacity: { keep: ['heat_capacity_factor'], told: true },
  capacity_untold: { keep: ['heat_capacity_factor'], told: false },
  hv: { keep: ['heat_transfer_factor'], told: true },
  hv_untold: { keep: ['heat_transfer_factor'], told: false },
  void: { keep: ['void_fraction'], told: true },
  rings: { keep: ['ring_flow'], told: true },
  cond: { keep: ['conductivity_factor', 'stirring_factor'] },
  loss: { keep: ['loss_factor'] },
  ambient: { keep: 'none', ambient: true },
  all: { keep: 'all', ambient: true, told: true },
  machine: { keep: 'none', machine: 'random' },
};

const wanted = (process.argv[2] ?? 'nominal').split(',');
const seeds = Number(process.argv[3] ?? 2);
const startArg = process.argv[4] ?? 'now';
const plainUnit = unitWith('all', 'independent');
const cells = Number(process.env.CELLS ?? plainUnit.estimator.cells);
const machineAsBuilt = { ...plainUnit.machine, loss_follows_flow: 0 } as typeof plainUnit.machine;
const unit = {
  ...plainUnit,
  machine: machineAsBuilt,
  estimator: { ...plainUnit.estimator, cells },
};
const model = unitModel(unit);

/** What is told: all gas is metered, and each store's heat capacity. */
function toldOf(stores: readonly SimulatedStore[], models: readonly StoreModel[]): Gaussian {
  const logs = stores.map((store, s) => {
    const { p } = store.bed;
    const solid = (1 - p.void_fraction) / (1 - models[s]!.store.bed.void_fraction);
    return -Math.log(p.heat_capacity_factor * solid);
  });
  return {
    mean: Float64Array.from([...logs, 0]),
    covariance: [...logs, 0].map(() => new Float64Array(logs.length + 1)),
  };
}

for (const name of wanted) {
  const c = CASES[name]!;
  const off: number[] = [];
  const rows: string[] = [];
  for (let seed = 1; seed <= seeds; seed++) {
    const plant = createTruth({
      seed,
      geometry,
      machine: c.machine ?? 'known',
      meter: 'exact',
      adjust: (draw) => {
        const stores = Object.fromEntries(
          Object.entries(draw.stores).map(([id, own]) => {
            if (c.keep === 'all') return [id, own];
            const nominal = {
              ...own,
              heat_capacity_factor: 1,
              heat_transfer_factor: 1,
              void_fraction: geometry.stores.find((s) => s.id === id)!.void_fraction,
              conductivity_factor: 1,
              stirring_factor: 1,
              loss_factor: 1,
              ring_flow: own.ring_flow.map(() => 1),
            };
            if (c.keep === 'none') return [id, nominal];
            return [id, { ...nominal, ...Object.fromEntries(c.keep.map((k) => [k, own[k]])) }];
          }),
        );
        return {
          ...draw,
          stores,
          ambient: c.ambient ? draw.ambient : { mean_K: 288.15, swing_K: 0 },
        };
      },
      resolution: { cells: 400 },
    });
    const at = new Set([2, 4, 6, 7.5, 9, 10.5, 12, 14, 16, 17.5, 19]);
    plant.run(scheduleFor('day', geometry, 19 * H), (_, truth, now) => {
      const h = Math.round(now.elapsed_s / 60) / 60;
      if (!at.has(h)) return;
      const true_h = now.hoursAt(power).hours;
      const state = startUnit(unit);
      model.stores.forEach((m, s) => {
        setTrueState(m, state.stores[s]!, now.stores[s]!, { physics: c.told ?? true });
      });
      const discharging = truth.mode === 'discharge';
      const input = {
        unit,
        machine: model.machine,
        models: model.stores,
        states: state.stores,
        plenum_K: now.stores.map((s) => (discharging ? s.pipe_K[0] : Number.NaN)),
        calibration: (c.told ?? true) ? toldOf(now.stores, model.stores) : null,
        ambient_K: truth.ambient_K,
      };
      const ours = centralHours(input as never, power);
      rows.push(
        `  seed ${seed} ${h.toFixed(1)} h ${truth.mode} true ${true_h.toFixed(3)} ours ${ours.hours.toFixed(3)} ${ours.ends_by} off ${(ours.hours - true_h).toFixed(3)}`,
      );
      if (true_h > 0) off.push(ours.hours - true_h);
    });
  }
  const mean = off.reduce((a, b) => a + b, 0) / off.length;
  const rms = Math.sqrt(off.reduce((a, b) => a + b * b, 0) / off.length);
  console.log(
    `${name}: mean ${mean.toFixed(4)} rms ${rms.toFixed(4)} worst ${off.reduce((a, b) => (Math.abs(b) > Math.abs(a) ? b : a), 0).toFixed(4)}`,
  );
  if (startArg === 'rows') console.log(rows.join('\n'));
}
