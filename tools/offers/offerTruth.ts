import { existsSync, mkdirSync } from 'node:fs';
import { join } from 'node:path';
import { RandomStream } from '../../test/plant/random.js';
import { createTruth, type ScanReadings, type Segment } from '../../test/plant/truth.js';
import { folder } from '../score/folder.js';
import { Recording } from '../score/recording.js';
import { SCAN_S } from '../score/sensorSets.js';
import { truthGeometry, withTwins } from '../score/truthPlant.js';

/** How the unit came into the state that is asked about. */
export const PREPARATIONS = ['full', 'part_charged', 'part_discharged', 'charged_stood'] as const;
export type Preparation = (typeof PREPARATIONS)[number];
export const SHARES = [0.4, 0.7, 1] as const;
export const WAITS_H = [0, 4, 12] as const;

/** One question with its true answer: a plant, machine and sensors of its own by seed. */
export interface OfferCase {
  readonly seed: number;
  readonly preparation: Preparation;
  /** Power asked for over rated power [-]. */
  readonly share: number;
  /** Time until the discharge begins [h]. */
  readonly wait_h: number;
}

const H = 3600;

/** The case of a seed: powers, waits and preparations go round evenly. */
export function caseOf(seed: number): OfferCase {
  return {
    seed,
    share: SHARES[seed % 3] as number,
    wait_h: WAITS_H[Math.floor(seed / 3) % 3] as number,
    preparation: PREPARATIONS[Math.floor(seed / 9) % 4] as Preparation,
  };
}

/** One cycle and then the preparation; powers and times drawn by seed. */
export function segmentsOf({ seed, preparation }: OfferCase, rated_W: number): Segment[] {
  const random = new RandomStream(seed, 'offer case');
  const between = (low: number, high: number): number => random.uniform(low, high);
  const charge = (hours: number): Segment => ({
    mode: 'charge',
    power_W: between(1.1, 1.6) * rated_W,
    duration_s: hours * H,
  });
  const discharge = (hours: number): Segment => ({
    mode: 'discharge',
    power_W: between(0.5, 1) * rated_W,
    duration_s: hours * H,
  });
  const stand = (hours: number): Segment => ({ mode: 'stand', duration_s: hours * H });
  const cycle = [charge(between(4, 6)), stand(between(0.2, 2)), discharge(between(3, 4))];
  const by: Record<Preparation, () => Segment[]> = {
    full: () => [charge(7)],
    part_charged: () => [charge(between(2, 4))],
    part_discharged: () => [charge(between(4, 6)), discharge(between(0.7, 2))],
    charged_stood: () => [charge(between(3, 5)), stand(between(2, 8))],
  };
  return [...cycle, stand(0.5), ...by[preparation]()];
}

/**
 * The recording up to the question, with the true hours as its only hours; kept on disk.
 *
 * @param hash of the code that makes it, see codeHash
 */
export function offerTruth(seed: number, hash: string): Recording {
  const place = join(folder, 'offers', `truth-${hash}`);
  mkdirSync(place, { recursive: true });
  const file = join(place, `${seed}.bin`);
  if (existsSync(file)) return Recording.load(file) as Recording;
  const made = makeTruth(caseOf(seed));
  made.save(file);
  return made;
}

function makeTruth(asked: OfferCase): Recording {
  const geometry = truthGeometry();
  const rated_W = geometry.rated_power_W;
  const plant = createTruth({ seed: asked.seed, machine: 'random', geometry, adjust: withTwins });
  const start_s = plant.time_s;
  const scans: ScanReadings[] = [];
  plant.run(segmentsOf(asked, rated_W), (scan) => scans.push(scan));
  const ahead = plant.clone();
  if (asked.wait_h > 0)
    ahead.run([{ mode: 'stand', duration_s: asked.wait_h * H }], () => undefined);
  const power_W = asked.share * rated_W;
  const { hours } = ahead.hoursAt(power_W);
  const ids = Object.keys(scans[0]?.readings ?? {});
  const kelvins = new Set(
    geometry.channels
      .filter((c) => c.measures === 'gas_temperature' || c.measures === 'ambient_temperature')
      .map((c) => c.id),
  );
  const channels = new Set(geometry.channels.map((c) => c.id));
  return Recording.make(
    scans,
    scans.map(() => []),
    {
      start_s,
      period_s: SCAN_S,
      truths: [],
      hours: [{ scan: scans.length - 1, power_W, hours }],
      temperatures: ids.filter((id) => !channels.has(id) || kelvins.has(id)),
      others: ids.filter((id) => channels.has(id) && !kelvins.has(id)),
    },
  );
}
