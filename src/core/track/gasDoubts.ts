import type { Direction, StoreEnd } from '../definitions.js';
import type { StoreTemperatures } from '../machine/machine.js';
import type { Scan } from '../scan/scan.js';
import type { UnitModel } from '../unitModel.js';
import type { Conditions } from './conditions.js';
import { type GasMemory, gasLimit_K, startGasMemory, stepGas } from './gasCheck.js';
import type { StoreModel, StoreState } from './storeTracker.js';

/** Both inlets of a store. */
export type GasMemories = Record<StoreEnd, GasMemory>;

/** A gas-temperature channel and what is known of it. */
export interface GasDoubt {
  readonly channel: string;
  readonly store: string;
  readonly end: StoreEnd;
  readonly doubtful: boolean;
  /** By what it was off when it was last looked at [K], the rock there, and what it may be off by. */
  readonly off_K: number;
  readonly rock_K: number;
  readonly limit_K: number;
}

const ENTERS: readonly (readonly [Direction, StoreEnd])[] = [
  ['charge', 'charge_inlet'],
  ['discharge', 'discharge_inlet'],
];

export const startGasMemories = (): GasMemories => ({
  charge_inlet: startGasMemory(),
  discharge_inlet: startGasMemory(),
});

/** Holds a store's inlet gas against its rock after a scan was taken in; see stepGas. */
export function followGas(
  model: UnitModel,
  s: number,
  state: StoreState,
  memories: GasMemories,
  scan: Scan,
  conditions: Conditions,
  dt_s: number,
  outlets: Readonly<Record<Direction, StoreTemperatures>>,
): void {
  const store = model.stores[s] as StoreModel;
  const { kind, id, bed } = store.store;
  const { flow_kg_s: flow, ambient_K } = conditions;
  const known = state.started && conditions.flowKnown && !conditions.flowStandIn;
  for (const [direction, end] of ENTERS) {
    const channel = model.map.gas[id]?.[end] ?? -1;
    if (channel < 0) continue;
    const into = direction === 'charge' ? flow : -flow;
    const enters = known && conditions.mode === direction && into > 0;
    stepGas(store, state, end, memories[end], {
      gas_K: scan.values[channel] as number,
      massFlux_kg_m2s: enters ? into / bed.area_m2 : 0,
      dt_s,
      ambient_K,
      values: scan.values,
      machine_K: () => {
        const { inlets } = model.machine.operate(direction, outlets[direction], ambient_K);
        return (kind === 'hot' ? inlets.hot_K : inlets.cold_K) ?? Number.NaN;
      },
    });
  }
}

/** What is known of each gas-temperature channel of the unit. */
export function gasDoubts(model: UnitModel, gas: readonly GasMemories[]): GasDoubt[] {
  return model.stores.flatMap((store, s) =>
    ENTERS.flatMap(([, end]) => {
      const channel = model.unit.channels[model.map.gas[store.store.id]?.[end] ?? -1];
      const memory = gas[s]?.[end];
      if (channel === undefined || memory === undefined) return [];
      const { doubtful, off_K, rock_K } = memory;
      const limit_K = gasLimit_K(store);
      return [
        { channel: channel.id, store: store.store.id, end, doubtful, off_K, rock_K, limit_K },
      ];
    }),
  );
}
