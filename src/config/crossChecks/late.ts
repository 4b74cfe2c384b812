import type { SiteBlock } from '../schema/site.js';
import { type CrossFault, cross } from './cross.js';

const DAY_H = 24;

/** What late readings need to be kept has to be kept so long. */
export function lateFaults({ late, store }: SiteBlock): CrossFault[] {
  const faults: CrossFault[] = [];
  const at = ['late', 'rewind_h'];
  for (const name of ['keep_readings_days', 'thin_after_days'] as const) {
    const most_h = store[name] * DAY_H;
    if (late.rewind_h <= most_h) continue;
    const expected = `at most store.${name} (${store[name]} d, which is ${most_h} h)`;
    faults.push(cross(at, late.rewind_h, expected, { others: [['store', name]] }));
  }
  if (late.rewind_h > 0 && late.rewind_point_every_s > late.rewind_h * 3600) {
    faults.push(
      cross(
        ['late', 'rewind_point_every_s'],
        late.rewind_point_every_s,
        `at most late.rewind_h (${late.rewind_h} h)`,
        { others: [at] },
      ),
    );
  }
  if (late.wait_most_s < late.quiet_s) {
    faults.push(
      cross(
        ['late', 'wait_most_s'],
        late.wait_most_s,
        `at least late.quiet_s (${late.quiet_s} s)`,
        {
          others: [['late', 'quiet_s']],
        },
      ),
    );
  }
  return faults;
}
