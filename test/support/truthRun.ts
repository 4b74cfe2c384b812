import { loadSite } from '../../src/config/load.js';
import type { UnitDefinition } from '../../src/core/definitions.js';
import type { Estimate } from '../../src/core/estimate.js';
import type { Scan } from '../../src/core/scan/scan.js';
import { advance, startUnit, type UnitState } from '../../src/core/unit.js';
import { DEMO_GEOMETRY } from '../plant/demoGeometry.js';
import {
  createTruth,
  type PlantTruth,
  type ScanReadings,
  type Segment,
  type TruthOptions,
} from '../plant/truth.js';
import { emptyScan, unitScan } from './unitScans.js';

export const H = 3600;
const PERIOD_S = 60;

let demo: UnitDefinition | undefined;

/**
 * The unit of config/demo.yaml at scans of a minute; the same one always, since the model that is
 * built of a definition is remembered with it.
 */
export function demoUnit(): UnitDefinition {
  if (demo !== undefined) return demo;
  const site = loadSite(new URL('../../config/demo.yaml', import.meta.url).pathname);
  const unit = site.units[0];
  if (unit === undefined) throw new Error('config/demo.yaml has no unit');
  demo = Object.freeze({ ...unit, scan_period_s: PERIOD_S });
  return demo;
}

export interface Step {
  readonly estimate: Estimate;
  readonly truth: PlantTruth;
}

/** The finer plant of the demonstration, half charged, and the estimator that watches it. */
export class WatchedPlant {
  readonly unit = demoUnit();
  readonly state: UnitState = startUnit(this.unit);
  readonly plant;

  constructor(options: Partial<TruthOptions> & { readonly seed: number }) {
    this.plant = createTruth({
      geometry: { ...DEMO_GEOMETRY, scan_period_s: PERIOD_S },
      resolution: { cells: 100, shells: 2 },
      initial: {
        hot: { front_m: 4.5, width_m: 0.6 },
        cold: { front_m: 4.5, width_m: 0.6 },
      },
      ...options,
    });
  }

  /** Runs segments under the estimator's eyes. */
  watch(segments: readonly Segment[]): Step[] {
    return this.run(segments, (readings) => unitScan(this.unit, readings));
  }

  /** Runs segments unseen: nothing arrives, and time passes for the estimator too. */
  hide(segments: readonly Segment[]): Step[] {
    return this.run(segments, ({ time_s }) => emptyScan(this.unit, Math.round(time_s * 1000)));
  }

  private run(segments: readonly Segment[], scanOf: (readings: ScanReadings) => Scan): Step[] {
    const steps: Step[] = [];
    this.plant.run(segments, (readings, truth) => {
      const ask = { hours_at_W: [], profile: false };
      const { estimate } = advance(this.unit, this.state, scanOf(readings), ask);
      steps.push({ estimate, truth });
    });
    return steps;
  }
}

/** Errors of the state of charge of all stores, with their sigmas and the estimate they are of. */
export function chargeErrors(
  steps: readonly Step[],
): { store: string; error: number; sigma: number; scan: number }[] {
  return steps.flatMap(({ estimate, truth }, scan) =>
    Object.entries(estimate.stores).map(([store, { soc, soc_sigma }]) => ({
      store,
      scan,
      error: soc - (truth.stores[store]?.soc as number),
      sigma: soc_sigma,
    })),
  );
}

/** Every verdict that appeared, as `sensor verdict`. */
export function verdictsOf(steps: readonly Step[]): Set<string> {
  return new Set(
    steps.flatMap(({ estimate }) =>
      Object.values(estimate.stores).flatMap((s) =>
        s.sensors.rejected.map((r) => `${r.id} ${r.verdict}`),
      ),
    ),
  );
}
