import type { SiteConfig } from '../config/site.js';
import type { Core } from './core.js';
import { UnitRunner } from './unitRunner.js';

const CLOCK_TOLERANCE_S = 300;
/** A longer gap is handed to the core in one, which bridges it itself. */
const LONGEST_GAP_SCANS = 2000;

/** A runner for each unit of the site, by its id. */
export function makeRunners(site: SiteConfig, core: Core): ReadonlyMap<string, UnitRunner> {
  const assembly = {
    deadline_ms: site.scan_deadline_s * 1000,
    future_tolerance_ms: (site.clock_tolerance_s ?? CLOCK_TOLERANCE_S) * 1000,
    longest_gap_scans: LONGEST_GAP_SCANS,
  };
  return new Map(site.units.map((unit) => [unit.id, new UnitRunner(unit, core, assembly)]));
}
