import { loadSite } from '../../../src/config/load.js';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import type { TuneBin, TuneRecord } from '../../../src/core/tune/record.js';
import { ringsOf } from '../../../src/core/tune/rings.js';
import { runStore, type StoreGuess } from '../../../src/core/tune/simulate.js';
import { type UnitModel, unitModel } from '../../../src/core/unitModel.js';

/** The hot-air store: one store, two strings, the outer one near the wall. */
export function airUnit(): UnitDefinition {
  return loadSite('config/hot-air.yaml').units[0]!;
}

export interface OwnModelOptions {
  /** (kg/s, h) one after another; 0 stands. */
  readonly plan: readonly (readonly [flow_kg_s: number, hours: number])[];
  readonly guess?: Partial<StoreGuess>;
  /** ln(true/metered flow) of each string. */
  readonly flow?: readonly number[];
  /** The machine's own power over its model; null: no power read. */
  readonly work?: number | null;
}

export const NOTHING: StoreGuess = {
  transfer: 0,
  conductivity: 0,
  loss: 0,
  chargeInlet_K: 0,
  dischargeInlet_K: 0,
  meterSlope: 0,
  share: 0.5,
  lag_s: 100,
  wallSteel: 0,
};

/** A recording without noise of the very model that is fitted, with values planted in it. */
export function ownRecording(options: OwnModelOptions): { model: UnitModel; record: TuneRecord } {
  const unit = airUnit();
  const model = unitModel(unit);
  const store = model.stores[0]!;
  const { length_m } = store.store.bed;
  const bare: TuneBin[] = [];
  let run = 0;
  let running = 0;
  let time_ms = Date.UTC(2025, 5, 1);
  for (const [flow, hours] of options.plan) {
    const sign = Math.sign(flow);
    if (sign !== 0 && sign !== running) {
      run++;
      running = sign;
    }
    for (let k = 0; k < hours * 12; k++) {
      time_ms += 300_000;
      const direction = flow >= 0 ? 'charge' : 'discharge';
      const outlets = { hot_K: direction === 'charge' ? 460 : 865, cold_K: null };
      const { specificWork_J_kg: w } = model.machine.operate(direction, outlets, 285);
      const gross = Math.abs(flow) * w * (options.work ?? 1);
      const auxiliary = model.machine.auxiliary_running_W;
      const power = direction === 'charge' ? gross + auxiliary : auxiliary - gross;
      bare.push({
        end_ms: time_ms,
        dt_s: 300,
        flow_kg_s: flow,
        ambient_K: 285,
        middle: 0.6,
        run,
        inlet_K: [flow >= 0 ? 873.15 : 453.15],
        inletMeasured: [true],
        readings: [],
        power_W: options.work === null ? Number.NaN : flow === 0 ? 2000 : power,
        outlets,
        since_s: k * 300,
      });
    }
  }
  const flowing = bare.filter((bin) => bin.flow_kg_s !== 0);
  const plan = {
    store,
    rings: ringsOf(store),
    bins: bare,
    s: 0,
    meanFlow_kg_s:
      flowing.reduce((sum, bin) => sum + Math.abs(bin.flow_kg_s), 0) / Math.max(1, flowing.length),
    positions_m: store.store.strings.map((one) => one.thermocouples.map((t) => t.position_m)),
  };
  const cells = 100;
  const start_K = Float64Array.from({ length: cells }, (_, i) => {
    const x = ((i + 0.5) * length_m) / cells;
    return 453.15 + 420 * 0.5 * (1 - Math.tanh((x - 1.2) / 0.45));
  });
  const guess = { ...NOTHING, ...options.guess };
  const runs = runStore(
    plan,
    guess,
    store.store.strings.map((_, k) => ({
      flow: options.flow?.[k] ?? 0,
      transfer: 0,
      conductivity: 0,
      start_K,
    })),
  );
  const counts = plan.positions_m.map((row) => row.length);
  const bins = bare.map((bin, b) => ({
    ...bin,
    readings: [
      Float64Array.from(
        runs.flatMap((one, k) => [...one.value.subarray(b * counts[k]!, (b + 1) * counts[k]!)]),
      ),
    ],
  }));
  const from_ms = bins[0]!.end_ms - 300_000;
  return {
    model,
    record: { bins, from_ms, to_ms: bins.at(-1)!.end_ms, stretches: 1, leftOut_s: 0 },
  };
}
