import type { Mode, UnitDefinition } from '../core/definitions.js';
import { createMachine } from '../core/machine/machine.js';
import { Instruments } from './instruments.js';
import {
  advancePlant,
  ambientOf,
  hoursFrom,
  type PlantState,
  type PlantStop,
  socRange,
} from './plantState.js';
import { createPlantStore, type PlantStoreTruth, truthOf } from './plantStore.js';
import { createRandom } from './random.js';
import { incidentsOf, scheduleOf } from './schedule.js';

export interface DemoPlantOptions {
  readonly seed?: number;
  /** Plant time of the first step's beginning [ms since 1970]; rounded down to a whole scan period. */
  readonly start_ms?: number;
  /** False: nothing goes wrong. */
  readonly incidents?: boolean;
}

export interface DemoStep {
  /** Source time of the readings [ms]: the end of the step. */
  readonly time_ms: number;
  /** Channel id -> reading in the channel's raw unit; a channel that reports by exception may be absent. */
  readonly values: Readonly<Record<string, number | string | null>>;
}

export interface DemoTruth {
  readonly time_ms: number;
  readonly mode: Mode;
  /** Number of the cycle, 0 the first. */
  readonly cycle: number;
  readonly flow_kg_s: number;
  readonly power_W: number;
  readonly stores: Readonly<Record<string, PlantStoreTruth>>;
  /** What has gone wrong so far, in words. */
  readonly incidents: readonly string[];
}

export interface DemoPlant {
  /** Plant time of the last step, or of the start [ms]. */
  readonly time_ms: number;
  /** Runs the plant for one scan period and reads its instruments. */
  step(): DemoStep;
  /** What is true now, as no instrument knows it. */
  truth(): DemoTruth;
  /** True hours at a constant net power [W] from now on. */
  hoursTruth(power_W: number): number;
}

/** 2026-01-01T00:00:00Z. */
const DEFAULT_START_MS = 1767225600000;

/**
 * The simulated plant of the demonstration: stores with one stream tube per string, the unit's
 * machine, instruments with lag, offsets and noise, and a schedule that repeats. On its second cycle
 * dust takes the heat transfer of one store down, on the third a thermocouple sticks. It is a
 * model of its own: nothing of the estimator runs in it. Same seed, same readings.
 *
 * @throws RangeError for a unit without a hot store, or with channels in a unit that it cannot give
 */
export function createDemoPlant(unit: UnitDefinition, options: DemoPlantOptions = {}): DemoPlant {
  const seed = options.seed ?? 1;
  const random = createRandom(seed);
  const period_s = unit.scan_period_s;
  const start_s = Math.floor((options.start_ms ?? DEFAULT_START_MS) / 1000 / period_s) * period_s;
  const stores = unit.stores.map((store) => createPlantStore(store, random));
  const machine = createMachine(unit.machine);
  const state: PlantState = {
    unit,
    machine,
    workFactor: 1 + 0.01 * random.normal(),
    stores,
    time_s: start_s,
    mode: 'stand',
    since_s: 0,
    flow_kg_s: 0,
    power_W: machine.auxiliary_standing_W,
  };
  const instruments = new Instruments(unit, stores, random);
  const schedule = scheduleOf(unit);
  const incidents = options.incidents === false ? null : incidentsOf(unit);
  const happened: string[] = [];
  let phase = 0;
  let phaseStart_s = start_s;
  let cycleStart_s = start_s;
  let cycle = 0;
  let cleanTransfer = 0;
  let steps = 0;

  function nextPhase(): void {
    phase = (phase + 1) % schedule.length;
    phaseStart_s = state.time_s;
    if (phase === 0) {
      cycle++;
      cycleStart_s = state.time_s;
    }
  }

  function phaseIsOver(stop: PlantStop | null): boolean {
    const now = schedule[phase];
    if (!now || stop !== null || state.time_s - phaseStart_s >= now.longest_s - 1e-6) return true;
    if (now.until_soc === null) return false;
    const [least, most] = socRange(state);
    return now.mode === 'charge' ? most >= now.until_soc : least <= now.until_soc;
  }

  function goWrong(): void {
    if (!incidents) return;
    const { dust, stuck } = incidents;
    const since_s = state.time_s - cycleStart_s;
    const dusty = stores.find((s) => s.definition.id === dust.store);
    if (dusty && cycle >= dust.cycle && dusty.bed.transferFactor > dust.factor) {
      if (cleanTransfer === 0) {
        cleanTransfer = dusty.bed.transferFactor;
        happened.push(`dust in store ${dust.store}`);
      }
      const share = Math.min(1, cycle > dust.cycle ? 1 : since_s / dust.over_s);
      dusty.bed.transferFactor = Math.max(
        dust.factor,
        cleanTransfer * (dust.factor / cleanTransfer) ** share,
      );
    }
    const due = cycle > stuck.cycle || (cycle === stuck.cycle && since_s >= stuck.after_s);
    if (due && !happened.some((text) => text.includes(stuck.channel))) {
      happened.push(`thermocouple ${stuck.channel} sticks`);
      instruments.stick(stuck.channel);
    }
  }

  return {
    get time_ms() {
      return Math.round((start_s + steps * period_s) * 1000);
    },
    step() {
      const end_s = start_s + (steps + 1) * period_s;
      goWrong();
      // A phase that ends within the scan hands the rest of it to the next; at most one round of phases.
      for (let tried = 0; tried <= schedule.length && state.time_s < end_s - 1e-6; tried++) {
        const now = schedule[phase];
        const last = tried === schedule.length;
        const mode = last || !now ? 'stand' : now.mode;
        const stop = advancePlant(state, mode, now?.power_W ?? 0, end_s - state.time_s, (dt) =>
          instruments.follow(dt),
        );
        if (!last && phaseIsOver(stop)) nextPhase();
      }
      steps++;
      state.time_s = end_s;
      const ambient_K = ambientOf(unit, end_s);
      const { flow_kg_s, power_W } = state;
      const values = instruments.read({ stores, flow_kg_s, power_W, ambient_K, time_s: end_s });
      return { time_ms: Math.round(end_s * 1000), values };
    },
    truth() {
      return {
        time_ms: Math.round(state.time_s * 1000),
        mode: state.mode,
        cycle,
        flow_kg_s: state.flow_kg_s,
        power_W: state.power_W,
        stores: Object.fromEntries(stores.map((store) => [store.definition.id, truthOf(store)])),
        incidents: [...happened],
      };
    },
    hoursTruth: (power_W) => hoursFrom(state, power_W),
  };
}
