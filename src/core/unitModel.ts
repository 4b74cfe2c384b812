import type { UnitDefinition } from './definitions.js';
import { fullHoursOf } from './fullHours.js';
import { createMachine, type Machine } from './machine/machine.js';
import { type ChannelMap, mapChannels } from './track/conditions.js';
import { plausibleRanges } from './track/plausible.js';
import { type StoreModel, storeModel } from './track/storeTracker.js';

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
  readonly fullHours: () => number;
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
    fullHours: fullHoursOf(unit, machine, stores),
  };
  built.set(unit, model);
  return model;
}
