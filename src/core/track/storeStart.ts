import { isBelieved, judgeSensor, type SensorMemory } from './judge.js';
import { type StartReading, startTube } from './start.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeState } from './tube.js';
import { resetWall } from './wallZone.js';

/** Temperatures that the plant can produce, with room for its excursions [K]. */
export function plausibleRange(model: StoreModel): readonly [number, number] {
  const { reference_hot_K: hot, reference_cold_K: cold } = model.store;
  const margin = 0.35 * (hot - cold);
  return [cold - margin, hot + margin];
}

/** Readings of sensors that stand, within what the plant can produce. */
export function usableReadings(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
): { tube: number; sensor: number; position_m: number; value_K: number }[] {
  const [low, high] = plausibleRange(model);
  const out: { tube: number; sensor: number; position_m: number; value_K: number }[] = [];
  model.tubes.forEach((tube, k) => {
    tube.string.thermocouples.forEach((thermocouple, s) => {
      const memory = state.sensors[k]?.[s] as SensorMemory;
      // Of a group at fault, what its step leaves.
      const value = (values[model.channels[k]?.[s] as number] as number) - memory.shift_K;
      if (!isBelieved(memory) && memory.verdict !== 'open') return;
      if (!(value > low && value < high)) return;
      out.push({ tube: k, sensor: s, position_m: thermocouple.position_m, value_K: value });
    });
  });
  return out;
}

/** Draws every tube's profile anew through its readings (through all strings' where it has too few). */
export function restart(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
  inflate: number,
): void {
  const readings = usableReadings(model, state, values);
  model.tubes.forEach((tube, k) => {
    const own = readings.filter((r) => r.tube === k);
    const source = own.length >= 2 ? own : readings;
    if (source.length < 2) return;
    const start: StartReading[] = source.map((r) => ({
      position_m: r.position_m,
      value_K: r.value_K,
      sensor: r.tube === k ? r.sensor : -1,
    }));
    startTube(tube, state.tubes[k] as TubeState, start, inflate);
    if (model.wall?.tube === k && state.wall !== null) {
      resetWall(model.tables, state.wall, state.tubes[k] as TubeState);
    }
  });
  for (const memory of state.sensors.flat()) {
    // What moved was the estimate that is given up, not the rock.
    memory.moved_K = 0;
    memory.expected_K = Number.NaN;
  }
  state.missed = 0;
  state.settled = 0;
  state.used = readings.length;
}

/** Verdicts of the first scan: only what needs no prediction. */
export function rememberStart(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
  time_ms: number,
): void {
  const readings = new Set(
    usableReadings(model, state, values).map((r) => `${r.tube}/${r.sensor}`),
  );
  const present = model.channels.flat().some((at) => Number.isFinite(values[at] as number));
  model.tubes.forEach((tube, k) => {
    for (let s = 0; s < tube.layout.sensors; s++) {
      if (readings.has(`${k}/${s}`)) continue;
      const { reference_hot_K: hot, reference_cold_K: cold } = model.store;
      judgeSensor(state.sensors[k]?.[s] as SensorMemory, {
        time_ms,
        dt_s: 0,
        value_K: values[model.channels[k]?.[s] as number] as number,
        othersPresent: present,
        predicted_K: (hot + cold) / 2,
        sigma_K: (hot - cold) / 2,
        rock_K: (hot + cold) / 2,
        rockSigma_K: Number.POSITIVE_INFINITY,
        placeSigma_K: 0,
        offsetSigma_K: 0,
        groupSigma_K: 0,
        deadband_K: 0,
        range_K: plausibleRange(model),
        supported: false,
        movesAlike: false,
        topGas_K: Number.NaN,
      });
    }
  });
}
