import type { EstimatorDefinition, StoreDefinition } from '../../../src/core/definitions.js';
import { storeEnergy } from '../../../src/core/track/storeEnergy.js';
import {
  type StoreState,
  startStore,
  stepStore,
  storeModel,
} from '../../../src/core/track/storeTracker.js';
import type { TubeDrive } from '../../../src/core/track/tube.js';
import { DEMO_GEOMETRY } from '../../plant/demoGeometry.js';
import { drawPlant } from '../../plant/draws.js';
import { RandomStream } from '../../plant/random.js';
import { SimulatedStore } from '../../plant/simulatedStore.js';

const H = 3600;
export const SCAN_S = 120;
const FLOW_KG_S = 20;

/** Charge, stand, discharge of a hot store: what the machine does not need to decide. */
const PHASES = [
  { flow: FLOW_KG_S, hours: 5 },
  { flow: 0, hours: 1 },
  { flow: -FLOW_KG_S, hours: 5 },
];
/** One cycle with all thermocouples, then one without. */
const CYCLES = 2;

/** The store's conditions, scan by scan, as far as its meters know. */
export function drivesOf(store: StoreDefinition): TubeDrive[] {
  const phases = Array.from({ length: CYCLES }, () => PHASES).flat();
  return phases.flatMap(({ flow, hours }) =>
    Array.from(
      { length: (hours * H) / SCAN_S },
      (): TubeDrive => ({
        massFlux_kg_m2s: flow / store.bed.area_m2,
        inlet_K: flow >= 0 ? store.reference_hot_K : store.reference_cold_K,
        inletSigma_K: 0,
        ambient_K: 288.15,
        dt_s: SCAN_S,
        travelSigma_m: 0,
      }),
    ),
  );
}

export interface Run {
  /** Error of the state of charge and its sigma at each scan since the loss [-]. */
  readonly error: readonly number[];
  readonly sigma: readonly number[];
}

/** One store of the finer plant, watched once for each set of lost thermocouples. */
export function watchStore(
  store: StoreDefinition,
  estimator: EstimatorDefinition,
  seed: number,
  lost: readonly ReadonlySet<string>[],
): Run[] {
  const known = DEMO_GEOMETRY.stores.find((s) => s.id === store.id)!;
  const geometry = { ...known, strings: store.strings };
  const draw = drawPlant({ ...DEMO_GEOMETRY, stores: [geometry] }, seed, {
    physics: 'random',
    machine: 'known',
    sensors: 'class',
    meter: 'random',
  });
  const plant = new SimulatedStore(geometry, draw, { cells: 120, shells: 2 });
  plant.start(0.18 * geometry.length_m, 0.5);
  const noise = new RandomStream(seed, 'noise');
  const ids = store.strings.flatMap((s) => s.thermocouples.map((t) => t.id));
  let next = 0;
  const channels = store.strings.map((s) => s.thermocouples.map(() => next++));
  const deadbands = channels.map((row) => row.map(() => 0));
  const model = storeModel(store, estimator, channels, deadbands);
  let states: StoreState[] = [startStore(model)];
  const drives = drivesOf(store);
  const loss_at = drives.length / CYCLES;
  const runs = lost.map(() => ({ error: [] as number[], sigma: [] as number[] }));
  drives.forEach((drive, n) => {
    if (n === loss_at) states = lost.map(() => structuredClone(states[0] as StoreState));
    const flow = drive.massFlux_kg_m2s * store.bed.area_m2;
    const read: Record<string, number> = {};
    plant.step(SCAN_S, flow / (1 + draw.meter.bias), drive.inlet_K, drive.ambient_K);
    plant.thermocouples.read(n * SCAN_S, noise, read);
    const truth = n < loss_at ? Number.NaN : plant.truth().soc;
    states.forEach((state, r) => {
      const gone = n < loss_at ? new Set<string>() : lost[r]!;
      const values = Float64Array.from(ids, (id) => (gone.has(id) ? Number.NaN : read[id]!));
      stepStore(model, state, n === 0 ? null : drive, values, n * SCAN_S * 1000, 0);
      if (n < loss_at) return;
      const { soc, soc_sigma, unseen } = storeEnergy(model, state);

      runs[r]!.error.push(soc - truth);
      // One string stands for the whole bed here; what flows beside it is not its thermocouples' matter.
      runs[r]!.sigma.push(Math.sqrt(soc_sigma ** 2 - unseen ** 2));
    });
  });
  return runs;
}
