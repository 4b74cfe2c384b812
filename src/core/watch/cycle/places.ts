import type { CycleStoreScan } from './cycleScan.js';

/** Places at which widths are taken, as shares of the bed's length. */
export const PLACES = [0.25, 0.5, 0.75] as const;
/** A front that came this near a place was there, in shares of the length. */
const NEAR = 0.01;

/** What was seen nearest to a place. */
export interface AtPlace {
  /** Distance from the place [m]. */
  readonly off_m: number;
  readonly width_m: number | null;
  readonly width_sigma_m: number | null;
  readonly spread_ratio: number | null;
}

/**
 * Takes what one scan shows at the places which the energy-equivalent position passed since the last
 * scan, or stands near by 1 % of the length. What has a width goes before what has none, then the
 * nearer before the farther. The energy-equivalent position needs no crossing and grows with what a bed
 * has taken in alone, so that a place is the same state of charge in a healthy and a damaged bed.
 *
 * @param seen by place, changed in place
 * @param before_m position at the last scan of the run; null = none
 */
export function passPlaces(
  seen: (AtPlace | null)[],
  before_m: number | null,
  { length_m, position_m, width_m, width_sigma_m, spread_ratio }: CycleStoreScan,
): void {
  PLACES.forEach((share, i) => {
    const place_m = share * length_m;
    const off_m = Math.abs(position_m - place_m);
    const passed = before_m !== null && (before_m - place_m) * (position_m - place_m) <= 0;
    if (passed || off_m <= NEAR * length_m)
      seen[i] = nearer(seen[i] ?? null, { off_m, width_m, width_sigma_m, spread_ratio });
  });
}

/** Of two sights of one place the better one; the earlier of equals. */
export function nearer(a: AtPlace | null, b: AtPlace | null): AtPlace | null {
  if (a === null || b === null) return a ?? b;
  const worth = ({ width_m, spread_ratio }: AtPlace) =>
    (width_m === null ? 0 : 1) + (spread_ratio === null ? 0 : 1);
  if (worth(a) !== worth(b)) return worth(a) > worth(b) ? a : b;
  return b.off_m < a.off_m ? b : a;
}
