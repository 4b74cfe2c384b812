import type { PlantChange, SensorFault } from '../../test/plant/faults.js';
import type { PlantGeometry } from '../../test/plant/geometry.js';
import {
  createTruth,
  type ScanReadings,
  type Segment,
  type Truth,
} from '../../test/plant/truth.js';
import { Recording } from '../score/recording.js';

/** A plant before its first scan. The cache is keyed by the bundled code of this module. */
export function startPlant(
  seed: number,
  geometry: PlantGeometry,
  changes: readonly PlantChange[],
): Truth {
  return createTruth({ seed, geometry, changes });
}

/** A copy that goes on with what has gone wrong from now on. */
export function branchOff(
  plant: Truth,
  changes: readonly PlantChange[],
  faults: readonly SensorFault[],
): Truth {
  return plant.clone({ changes, faults });
}

/** Runs a plant over a schedule: its readings, and the true states of charge. */
export function recordPlant(plant: Truth, segments: readonly Segment[]): Recording {
  const { geometry, time_s: start_s } = plant;
  const scans: ScanReadings[] = [];
  const truths: number[][] = [];
  const stores = geometry.stores.map((s) => s.id);
  plant.run(segments, (scan, truth) => {
    scans.push(scan);
    truths.push(stores.map((id) => truth.stores[id]?.soc ?? Number.NaN));
  });
  const kelvins = new Set(
    geometry.channels
      .filter((c) => c.measures === 'gas_temperature' || c.measures === 'ambient_temperature')
      .map((c) => c.id),
  );
  const channels = new Set(geometry.channels.map((c) => c.id));
  const ids = Object.keys(scans[0]?.readings ?? {});
  return Recording.make(scans, truths, {
    start_s,
    period_s: geometry.scan_period_s,
    truths: stores.map((id) => `${id}.soc`),
    hours: [],
    temperatures: ids.filter((id) => !channels.has(id) || kelvins.has(id)),
    others: ids.filter((id) => channels.has(id) && !kelvins.has(id)),
  });
}
