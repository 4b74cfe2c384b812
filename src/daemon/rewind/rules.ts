import type { LateConfig, SiteConfig } from '../../config/site.js';
import { futureTolerance } from '../makeRunners.js';

export const DEFAULT_LATE: LateConfig = {
  rewind_h: 48,
  rewind_point_every_s: 900,
  quiet_s: 30,
  wait_most_s: 600,
};

/** What the configuration says of late readings. */
export interface RewindRules {
  /** Readings older than this against the newest are too late [ms]. */
  readonly reach_ms: number;
  /** Spacing of the states that are kept to go back to [ms of source time]. */
  readonly point_every_ms: number;
  /** A delivery is over where nothing late has come for this long [ms]. */
  readonly quiet_ms: number;
  /** But no late reading waits longer than this [ms]. */
  readonly wait_ms: number;
  readonly future_tolerance_ms: number;
}

export function rewindRules(site: SiteConfig): RewindRules {
  const late = site.late ?? DEFAULT_LATE;
  return {
    reach_ms: late.rewind_h * 3_600_000,
    point_every_ms: late.rewind_point_every_s * 1000,
    quiet_ms: late.quiet_s * 1000,
    wait_ms: late.wait_most_s * 1000,
    future_tolerance_ms: futureTolerance(site),
  };
}
