import { isBelieved, judgeSensor, type SensorMemory } from './judge.js';
import { isSparse, startAlongPath } from './pathStart.js';
import { type StartReading, startTube } from './start.js';
import type { StoreModel, StoreState } from './storeTracker.js';
import type { TubeDrive, TubeState } from './tube.js';
import { resetWall } from './wallZone.js';

/** Temperatures that the plant can produce, with room for its excursions [K]. */
export function plausibleRange(model: StoreModel): readonly [number, number] {
  const { reference_hot_K: hot, reference_cold_K: cold } = model.store;
  const margin = 0.35 * (hot - cold);
  return [cold - margin, hot + margin];
}

/** A reading of this age still tells where the front is: it goes some centimetres meanwhile. */
const RECENT_MS = 600_000;

/** Notes what each thermocouple reads, for a start from readings of the last minutes. */
export function rememberReadings(
  model: StoreModel,
  state: StoreState,
  values: Float64Array,
  time_ms: number,
): void {
  model.channels.forEach((row, k) => {
    row.forEach((at, s) => {
      const value = values[at] as number;
      if (!Number.isFinite(value)) return;
      const memory = state.sensors[k]?.[s] as SensorMemory;
      memory.seen_K = value;
      memory.seen_ms = time_ms;
    });
  });
}

/**
 * Readings of sensors that stand, within what the plant can produce: those of the last minutes, since
 * in one scan few may report.
 */
export function usableReadings(
  model: StoreModel,
  state: StoreState,
  time_ms: number,
): { tube: number; sensor: number; position_m: number; value_K: number }[] {
  const [low, high] = plausibleRange(model);
  const out: { tube: number; sensor: number; position_m: number; value_K: number }[] = [];
  model.tubes.forEach((tube, k) => {
    tube.string.thermocouples.forEach((thermocouple, s) => {
      const memory = state.sensors[k]?.[s] as SensorMemory;
      // Of a group at fault, what its step leaves.
      if (!(time_ms - memory.seen_ms <= RECENT_MS)) return;
      const value = memory.seen_K - memory.shift_K;
      if (!isBelieved(memory) && memory.verdict !== 'open') return;
      if (!(value > low && value < high)) return;
      out.push({ tube: k, sensor: s, position_m: thermocouple.position_m, value_K: value });
    });
  });
  return out;
}

/** For this long a profile that was drawn anew is no measure of a slow drift: the passage of a front. */
const GUESS_MS = 3 * 3600_000;

/**
 * Draws every tube's profile anew from its readings (from all strings' where it has too few): where they
 * stand far apart, as a past of charging or discharging would have left it; else, and where no such
 * past explains them, by lines through them.
 *
 * @param drive of the scan; null where there is no profile that could have moved, or no saying how
 */
export function restart(
  model: StoreModel,
  state: StoreState,
  time_ms: number,
  inflate: number,
  drive: TubeDrive | null,
): void {
  const readings = usableReadings(model, state, time_ms);
  model.tubes.forEach((tube, k) => {
    const own = readings.filter((r) => r.tube === k);
    const source = own.length >= 2 ? own : readings;
    if (source.length < 2) return;
    const start: StartReading[] = source.map((r) => ({
      position_m: r.position_m,
      value_K: r.value_K,
      sensor: r.tube === k ? r.sensor : -1,
    }));
    const tubeState = state.tubes[k] as TubeState;
    const along =
      drive !== null &&
      isSparse(start, model.store.bed.length_m) &&
      startAlongPath(tube, tubeState, start, drive);
    if (!along) startTube(tube, tubeState, start, inflate);
    if (model.wall?.tube === k && state.wall !== null) {
      resetWall(model.tables, state.wall, state.tubes[k] as TubeState);
    }
  });
  for (const memory of state.sensors.flat()) {
    // What moved was the estimate that is given up, not the rock.
    memory.moved_K = 0;
    memory.expected_K = Number.NaN;
    // In mid-bed the profile is a guess between thermocouples, and no measure of how one drifts.
    if (inflate > 1) memory.guess_ms = time_ms + GUESS_MS;
  }
  state.missed = 0;
  state.astray = 0;
  state.displaced.fill(null);
  state.settled = 0;
  state.known_s = 0;
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
    usableReadings(model, state, time_ms).map((r) => `${r.tube}/${r.sensor}`),
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
        guessed: false,
        flowing: false,
        topGas_K: Number.NaN,
      });
    }
  });
}
