import { createHash } from 'node:crypto';
import { join } from 'node:path';
import { createTruth, type ScanReadings } from '../../test/plant/truth.js';
import { folder } from './folder.js';
import { type HoursTruth, Recording } from './recording.js';
import type { TruthPlan } from './scenario.js';
import { TRUTH_COLUMNS, truthRow } from './truthColumns.js';
import { truthGeometry, withTwins } from './truthPlant.js';

/** True hours are wanted at this share of the rated power. */
const HOURS_SHARE = 0.6;

/** The recording of a plan and a seed, from the cache where it is there. */
export function truthOf(plan: TruthPlan, seed: number, hash: string): Recording {
  const geometry = truthGeometry();
  const segments = plan.segments(geometry, seed);
  const changes = plan.changes?.(seed) ?? [];
  // Plans are part of the name by their content, so that an edited schedule is another truth.
  const content = createHash('sha256')
    .update(JSON.stringify([plan.machine, plan.hours_every_min, segments, changes]))
    .digest('hex')
    .slice(0, 8);
  const file = join(folder, 'truth', hash, `${plan.id}-${content}-${seed}.bin`);
  const kept = Recording.load(file);
  if (kept) return kept;
  const plant = createTruth({
    seed,
    geometry,
    machine: plan.machine,
    changes,
    adjust: withTwins,
  });
  const scans: ScanReadings[] = [];
  const truths: number[][] = [];
  const hours: HoursTruth[] = [];
  const start_s = plant.time_s;
  const period_s = geometry.scan_period_s;
  const every = plan.hours_every_min === null ? 0 : (plan.hours_every_min * 60) / period_s;
  plant.run(segments, (scan, truth, now) => {
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
  const recording = Recording.make(scans, truths, {
    start_s,
    period_s,
    truths: TRUTH_COLUMNS,
    hours,
    temperatures,
    others,
  });
  recording.save(file);
  return recording;
}
