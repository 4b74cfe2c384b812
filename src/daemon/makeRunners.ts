import type { SiteConfig } from '../config/site.js';
import type { UnitDefinition } from '../core/definitions.js';
import type { Core } from './core.js';
import { UnitRunner } from './unitRunner.js';

const CLOCK_TOLERANCE_S = 300;
/** A longer gap is handed to the core in one, which bridges it itself. */
const LONGEST_GAP_SCANS = 2000;

/** So many units may roll out their state of charge in one scan: some 40 ms each. */
const FEW_UNITS = 20;

/** What makes a runner of a unit of the site without a past. */
export type MakeRunner = (unit: UnitDefinition) => UnitRunner;

export function runnerMaker(site: SiteConfig, core: Core): MakeRunner {
  const assembly = {
    deadline_ms: site.scan_deadline_s * 1000,
    future_tolerance_ms: futureTolerance(site),
    longest_gap_scans: LONGEST_GAP_SCANS,
  };
  const phase = unitPhases(site);
  const isMany = site.units.length > FEW_UNITS;
  return (unit) => {
    const place = phase(unit.id);
    const phases = { hours_ms: place * unit.hours_every_s * 1000, rollout: isMany ? place : 0 };
    return new UnitRunner(unit, core, assembly, phases);
  };
}

/**
 * Share of an interval by which each unit does what all do at intervals (hours, saved states): the
 * first at even times, the others spread behind it, so that many never do it in the same scan.
 */
export function unitPhases({ units }: Pick<SiteConfig, 'units'>): (unit: string) => number {
  const places = new Map(units.map(({ id }, i) => [id, i / units.length]));
  return (unit) => places.get(unit) ?? 0;
}

/** A reading stamped further ahead of its arrival than this is not believed [ms]. */
export function futureTolerance(site: SiteConfig): number {
  return (site.clock_tolerance_s ?? CLOCK_TOLERANCE_S) * 1000;
}
