import type { PlantGeometry } from './geometry.js';
import type { Segment } from './truth.js';

const H = 3600;

/** Schedules by name, as multiples of the plant's rated power. */
export const SCHEDULES: Readonly<Record<string, (geometry: PlantGeometry) => Segment[]>> = {
  /** One day: charge, stand, discharge at rated power, charge again, stand, discharge in part load. */
  day: ({ rated_power_W: P }) => [
    { mode: 'charge', power_W: 1.5 * P, duration_s: 6.5 * H },
    { mode: 'stand', duration_s: 2 * H },
    { mode: 'discharge', power_W: P, duration_s: 4 * H },
    { mode: 'stand', duration_s: 0.5 * H },
    { mode: 'charge', power_W: 1.2 * P, duration_s: 3.5 * H },
    { mode: 'stand', duration_s: 1.5 * H },
    { mode: 'discharge', power_W: 0.6 * P, duration_s: 5 * H },
    { mode: 'stand', duration_s: H },
  ],
  /** Partial cycles at changing power; seven of these make a week that never repeats a front. */
  partial: ({ rated_power_W: P }) => [
    { mode: 'charge', power_W: 1.4 * P, duration_s: 5 * H },
    { mode: 'discharge', power_W: 0.9 * P, duration_s: 2.5 * H },
    { mode: 'charge', power_W: P, duration_s: 2 * H },
    { mode: 'stand', duration_s: 3 * H },
    { mode: 'discharge', power_W: 0.5 * P, duration_s: 4 * H },
    { mode: 'charge', power_W: 0.8 * P, duration_s: 3.5 * H },
    { mode: 'discharge', power_W: 0.7 * P, duration_s: 3 * H },
    { mode: 'stand', duration_s: H },
  ],
  /** Charged, then 36 hours of rest. */
  standing: ({ rated_power_W: P }) => [
    { mode: 'charge', power_W: 1.5 * P, duration_s: 5 * H },
    { mode: 'stand', duration_s: 36 * H },
    { mode: 'discharge', power_W: P, duration_s: 3 * H },
  ],
};

/** A schedule repeated and cut to a duration. */
export function scheduleFor(name: string, geometry: PlantGeometry, duration_s: number): Segment[] {
  const make = SCHEDULES[name];
  if (!make)
    throw new RangeError(
      `schedule must be one of ${Object.keys(SCHEDULES).join(', ')}, got ${name}`,
    );
  const once = make(geometry);
  const segments: Segment[] = [];
  let left = duration_s;
  for (let i = 0; left > 0; i = (i + 1) % once.length) {
    const segment = once[i]!;
    const length = Math.min(segment.duration_s, left);
    segments.push({ ...segment, duration_s: length });
    left -= length;
  }
  return segments;
}
