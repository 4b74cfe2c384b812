import type { UnitDefinition } from './definitions.js';
import { centralHours } from './dispatch/hours.js';
import { createMachine, type Machine } from './machine/machine.js';
import { type ChannelMap, mapChannels } from './track/conditions.js';
import { plausibleRanges } from './track/plausible.js';
import { type StoreModel, startStore, storeModel } from './track/storeTracker.js';
import { setTubeTemperatures, type TubeState } from './track/tube.js';
import { resetWall } from './track/wallZone.js';

/** What is built once from a unit's definition: property tables, machine, channel indices. */
export interface UnitModel {
  readonly unit: UnitDefinition;
  readonly machine: Machine;
  readonly map: ChannelMap;
  /** What each channel may read; see plausible. */
  readonly ranges: ReturnType<typeof plausibleRanges>;
  readonly stores: readonly StoreModel[];
  /** Channel indices of all thermocouples. */
  readonly thermocouples: readonly number[];
  /** Hours at rated power from stores that stand at their charged reference throughout. */
  readonly fullHours: number;
}

const built = new WeakMap<UnitDefinition, UnitModel>();

/**
 * The model of a unit; built on the first call and remembered with the (frozen) definition.
 *
 * @throws RangeError where a thermocouple of a string has no channel
 */
export function unitModel(unit: UnitDefinition): UnitModel {
  const known = built.get(unit);
  if (known !== undefined) return known;
  const index = new Map(unit.channels.map((channel, i) => [channel.id, i]));
  const stores = unit.stores.map((store) => {
    const channels = store.strings.map((string) =>
      string.thermocouples.map((thermocouple) => {
        const at = index.get(thermocouple.id);
        if (at === undefined) {
          throw new RangeError(`thermocouple ${thermocouple.id}: no channel of this id`);
        }
        return at;
      }),
    );
    const deadbands = channels.map((row) =>
      row.map((at) => {
        const reporting = unit.channels[at]?.reporting;
        return reporting?.kind === 'by_exception' ? reporting.deadband : 0;
      }),
    );
    return storeModel(store, unit.estimator, channels, deadbands);
  });
  const machine = createMachine(unit.machine);
  const model: UnitModel = {
    unit,
    machine,
    map: mapChannels(unit),
    ranges: plausibleRanges(unit),
    stores,
    thermocouples: stores.flatMap((store) => store.channels.flat()),
    fullHours: hoursWhenFull(unit, machine, stores),
  };
  built.set(unit, model);
  return model;
}

function hoursWhenFull(
  unit: UnitDefinition,
  machine: Machine,
  models: readonly StoreModel[],
): number {
  const states = models.map((model) => {
    const state = startStore(model);
    const { kind, reference_hot_K, reference_cold_K } = model.store;
    model.tubes.forEach((tube, k) => {
      const full = kind === 'hot' ? reference_hot_K : reference_cold_K;
      const profile = new Float64Array(tube.layout.cells).fill(full);
      setTubeTemperatures(tube, state.tubes[k] as TubeState, profile);
    });
    if (model.wall !== null && state.wall !== null) {
      resetWall(model.tables, state.wall, state.tubes[model.wall.tube] as TubeState);
    }
    return state;
  });
  const input = {
    unit,
    machine,
    models,
    states,
    plenum_K: models.map(() => Number.NaN),
    calibration: null,
    ambient_K: unit.ambient_K,
  };
  return centralHours(input, unit.rated_power_W).hours;
}
