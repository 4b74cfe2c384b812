import type { PlantChange } from '../../test/plant/faults.js';
import { RandomStream } from '../../test/plant/random.js';
import type { Segment } from '../../test/plant/truth.js';
import { GEOMETRY } from './branches.js';

const H = 3600;
/** Plants that are only run healthy have seeds of their own, this far from those with faults. */
export const WEEKS_SEED = 500;
/** Length of one healthy stretch [d]. */
export const WEEKS_D = 11;

/**
 * Eleven healthy days as a trader would have them: charges and discharges of any length at changing
 * power, some cut by the unit's limits, some reversed at once, rests of minutes to more than a day.
 */
export function weekSegments(seed: number): Segment[] {
  const random = new RandomStream(seed, 'watch weeks');
  const P = GEOMETRY.rated_power_W;
  const segments: Segment[] = [];
  let left_s = WEEKS_D * 24 * H;
  const add = (segment: Segment): void => {
    const duration_s = Math.min(60 * Math.round(segment.duration_s / 60), left_s);
    if (duration_s > 0) segments.push({ ...segment, duration_s });
    left_s -= duration_s;
  };
  const rest = (): void => {
    const lot = random.uniform();
    if (lot < 0.35) return;
    const hours =
      lot < 0.75
        ? random.uniform(0.2, 4)
        : lot < 0.95
          ? random.uniform(6, 14)
          : random.uniform(24, 36);
    add({ mode: 'stand', duration_s: hours * H });
  };
  /** A run in one to three parts, each with a power of its own. */
  const run = (mode: 'charge' | 'discharge', hours: number, low: number, high: number): void => {
    const parts = 1 + Math.floor(random.uniform(0, 3));
    for (let i = 0; i < parts; i++) {
      const power_W = random.uniform(low, high) * P;
      add({ mode, power_W, duration_s: (hours * H) / parts });
    }
  };
  while (left_s > 0) {
    run('charge', random.uniform(2, 7), 0.6, 1.5);
    rest();
    run('discharge', random.uniform(1.5, 6), 0.3, 1.05);
    rest();
  }
  return segments;
}

/** Weather over the same days: up to 8 K either way from the mean, turning within hours or a day. */
export function weekWeather(seed: number): PlantChange[] {
  const random = new RandomStream(seed, 'watch weather');
  const changes: PlantChange[] = [];
  let now_K = 0;
  for (let at_h = random.uniform(6, 30); at_h < WEEKS_D * 24; at_h += random.uniform(18, 60)) {
    const next_K = random.uniform(-8, 8);
    const ramp_s = random.uniform(4, 16) * H;
    changes.push({ kind: 'weather', at_s: at_h * H, offset_K: next_K - now_K, ramp_s });
    now_K = next_K;
  }
  return changes;
}
