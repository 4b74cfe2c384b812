import type { StringDefinition } from '../definitions.js';
import type { TubeLayout } from '../track/layout.js';
import {
  emptyReading,
  predictReading,
  projectReading,
  readingVariance,
} from '../track/measurement.js';
import { type AcceptedReading, applyReadings } from '../track/readingUpdate.js';
import { blankTube } from '../track/start.js';
import {
  createTubeScratch,
  predictTube,
  type TubeDrive,
  type TubeModel,
  type TubeScratch,
  type TubeState,
  tubeModel,
} from '../track/tube.js';
import type { TubeMean } from './course.js';

/**
 * One tube with a set of thermocouples, of which the covariance alone matters. A Kalman filter's
 * covariance does not depend on what is read, only on where: readings equal to their prediction
 * leave the mean on the course and shrink the covariance as real ones would.
 */
export interface WeighedTube {
  readonly model: TubeModel;
  readonly state: TubeState;
  readonly scratch: TubeScratch;
  /** Thermocouples that are read, by their index in the string. */
  readonly reads: readonly boolean[];
}

/**
 * A tube to be weighed.
 *
 * @param reads whether the thermocouple with an id is read
 * @param state what is known at the start, changed in place; without it nothing is
 */
export function weighedTube(
  model: TubeModel,
  reads: (id: string) => boolean,
  state = blankTube(model),
): WeighedTube {
  return {
    model,
    state,
    scratch: createTubeScratch(model.layout),
    reads: model.string.thermocouples.map(({ id }) => reads(id)),
  };
}

/** The same tube, as it now is, with fewer thermocouples read. */
export function withoutSensors(from: WeighedTube, lost: (id: string) => boolean): WeighedTube {
  const state = structuredClone(from.state);
  const { thermocouples } = from.model.string;
  const reads = (id: string): boolean =>
    !lost(id) && (from.reads[thermocouples.findIndex((t) => t.id === id)] as boolean);
  return weighedTube(from.model, reads, state);
}

/** The same tube with one silent thermocouple of its string read. */
export function withSensor(from: WeighedTube, id: string): WeighedTube {
  const { thermocouples } = from.model.string;
  const known = new Set(thermocouples.filter((_, s) => from.reads[s]).map((t) => t.id));
  return weighedTube(
    from.model,
    (one) => one === id || known.has(one),
    structuredClone(from.state),
  );
}

/** Id of a thermocouple that is not there. */
const ONE_MORE = 'one more';

/**
 * The same tube, as it now is, with one thermocouple more at a place, on a card of its own: its
 * offset and place are as uncertain as the configuration says of every one.
 *
 * @param position_m distance from the charge inlet [m], within the bed
 * @throws RangeError where the place is not in the bed
 */
export function withOneMore(from: WeighedTube, position_m: number): WeighedTube {
  const { store, estimator, tables, string } = from.model;
  if (!(position_m >= 0 && position_m <= store.bed.length_m)) {
    throw new RangeError(`position_m ${position_m}: expected 0 to ${store.bed.length_m}`);
  }
  const more: StringDefinition = {
    ...string,
    thermocouples: [...string.thermocouples, { id: ONE_MORE, position_m, group: null }],
  };
  const model = tubeModel(store, more, estimator, tables);
  const state = blankTube(model);
  const index = places(from.model.layout, model.layout);
  const { size } = from.model.layout;
  for (let i = 0; i < size; i++) {
    for (let j = 0; j < size; j++) {
      state.covariance[(index[i] as number) * model.layout.size + (index[j] as number)] = from.state
        .covariance[i * size + j] as number;
    }
  }
  const weighed = weighedTube(model, (id) => id === ONE_MORE || readsOf(from, id), state);
  takeMean(weighed, from.state, from.model.layout);
  return weighed;
}

function readsOf(tube: WeighedTube, id: string): boolean {
  return tube.reads[tube.model.string.thermocouples.findIndex((t) => t.id === id)] ?? false;
}

/** Where each state of a layout stands in that of the same string with sensors added at its end. */
function places(from: TubeLayout, to: TubeLayout): Int32Array {
  const more = to.sensors - from.sensors;
  const behind = (i: number, block: number): number => (i >= block + from.sensors ? more : 0);
  return Int32Array.from(
    { length: from.size },
    (_, i) => i + behind(i, from.offset) + behind(i, from.position),
  );
}

/** Puts a tube's mean where another's is; states that the other does not have stay. */
export function takeMean(tube: WeighedTube, mean: TubeMean, of: TubeLayout): void {
  const { state, model } = tube;
  state.enthalpy.set(mean.enthalpy);
  state.gasLag_m.set(mean.gasLag_m);
  const index = places(of, model.layout);
  for (let i = of.cells; i < of.size; i++) {
    state.further[(index[i] as number) - of.cells] = mean.further[i - of.cells] as number;
  }
}

/**
 * One step: prediction, then `scans` scans of readings taken in at its end as their mean, each
 * equal to what the filter expects. The mean is then to be set by `takeMean`.
 */
export function stepWeighed(tube: WeighedTube, drive: TubeDrive, scans: number): void {
  const { model, state, scratch, reads } = tube;
  predictTube(model, state, drive, scratch);
  if (!(scans > 0)) return;
  const accepted: AcceptedReading[] = [];
  reads.forEach((read, sensor) => {
    if (!read) return;
    const reading = emptyReading(model.layout.cells);
    predictReading(model, state, sensor, reading);
    const v = scratch.projections[sensor] as Float64Array;
    projectReading(model, state, sensor, reading, v);
    const variance_K2 = readingVariance(model, reading) / scans;
    accepted.push({ sensor, reading, v, innovation_K: 0, variance_K2 });
  });
  applyReadings(model, state, accepted, scratch.temperature);
}
