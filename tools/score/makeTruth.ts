import type { PlantChange } from '../../test/plant/faults.js';
import type { PlantGeometry } from '../../test/plant/geometry.js';
import { createTruth, type ScanReadings, type Segment } from '../../test/plant/truth.js';
import { type HoursTruth, Recording } from './recording.js';
import { TRUTH_COLUMNS, truthRow } from './truthColumns.js';
import { withTwins } from './twins.js';

/** True hours are wanted at this share of the rated power. */
const HOURS_SHARE = 0.6;

/** All that a truth is made of; plain data, so that its text names it in the cache. */
export interface TruthInput {
  readonly seed: number;
  readonly machine: 'known' | 'random';
  readonly geometry: PlantGeometry;
  readonly segments: readonly Segment[];
  readonly changes: readonly PlantChange[];
  readonly hours_every_min: number | null;
}

/**
 * Runs the finer plant. The cache is keyed by the bundled code of this module, so it imports only
 * what a truth depends on.
 */
export function makeTruth(input: TruthInput): Recording {
  const { geometry, hours_every_min } = input;
  const plant = createTruth({ ...input, adjust: withTwins });
  const scans: ScanReadings[] = [];
  const truths: number[][] = [];
  const hours: HoursTruth[] = [];
  const start_s = plant.time_s;
  const period_s = geometry.scan_period_s;
  const every = hours_every_min === null ? 0 : (hours_every_min * 60) / period_s;
  plant.run(input.segments, (scan, truth, now) => {
    scans.push(scan);
    truths.push(truthRow(now, truth));
    if (every === 0 || scans.length % every !== 0) return;
    const power_W = HOURS_SHARE * geometry.rated_power_W;
    hours.push({ scan: scans.length - 1, power_W, hours: now.hoursAt(power_W).hours });
  });
  const ids = Object.keys(scans[0]!.readings);
  const kelvins = new Set(
    geometry.channels
      .filter((c) => c.measures === 'gas_temperature' || c.measures === 'ambient_temperature')
      .map((c) => c.id),
  );
  const channels = new Set(geometry.channels.map((c) => c.id));
  const temperatures = ids.filter((id) => !channels.has(id) || kelvins.has(id));
  const others = ids.filter((id) => channels.has(id) && !kelvins.has(id));
  return Recording.make(scans, truths, {
    start_s,
    period_s,
    truths: TRUTH_COLUMNS,
    hours,
    temperatures,
    others,
  });
}
