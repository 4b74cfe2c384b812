import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { isSparse, startAlongPath } from '../../../src/core/track/pathStart.js';
import { blankTube, type StartReading } from '../../../src/core/track/start.js';
import {
  createTubeScratch,
  predictTube,
  setTubeTemperatures,
  type TubeDrive,
  type TubeModel,
  type TubeState,
  tubeTemperatures,
} from '../../../src/core/track/tube.js';
import { denseOf, leastEigenvalue } from './dense.js';
import { hotStore, modelOf, stringOf } from './plants.js';

const LENGTH = 4;
const SENSORS = 5;
const MODEL = modelOf(hotStore({ strings: [stringOf('h', SENSORS, LENGTH)] }));
const TUBE = MODEL.tubes[0] as TubeModel;
const { cells, size } = TUBE.layout;
const HOT = MODEL.store.reference_hot_K;
const COLD = MODEL.store.reference_cold_K;

const drive = (flux: number): TubeDrive => ({
  massFlux_kg_m2s: flux,
  inlet_K: flux > 0 ? HOT : COLD,
  inletSigma_K: 0,
  ambient_K: 283.15,
  dt_s: 60,
  travelSigma_m: 0,
});

/** A tube with an even front, known to `sigma_K`, that has run for so many scans at a flux. */
function tubeAt(front_m: number, scans: number, flux: number): TubeState {
  const state = blankTube(TUBE);
  const dx = LENGTH / cells;
  const profile = Float64Array.from(
    { length: cells },
    (_, i) => COLD + ((HOT - COLD) * (1 - Math.tanh(((i + 0.5) * dx - front_m) / 0.4))) / 2,
  );
  setTubeTemperatures(TUBE, state, profile);
  for (let i = 0; i < cells; i++) {
    for (let j = 0; j < cells; j++) state.covariance[i * size + j] = i === j ? 1 : 0;
  }
  const scratch = createTubeScratch(TUBE.layout);
  for (let n = 0; n < scans; n++) predictTube(TUBE, state, drive(flux), scratch);
  return state;
}

const temperatures = (state: TubeState) => tubeTemperatures(TUBE, state, new Float64Array(cells));

/** What the string's thermocouples read of a tube's rock. */
function readingsOf(state: TubeState): StartReading[] {
  const t = temperatures(state);
  return TUBE.string.thermocouples.map(({ position_m }, sensor) => {
    const place = (position_m / LENGTH) * cells - 0.5;
    const cell = Math.floor(place);
    const [a, b] = [t[cell] as number, t[cell + 1] as number];
    return { position_m, value_K: a + (place - cell) * (b - a), sensor };
  });
}

/** Mean of the cells, and its sigma by a tube's covariance, over the span. */
function level(state: TubeState): { mean: number; sigma: number } {
  const mean = temperatures(state).reduce((a, b) => a + b, 0) / cells;
  let variance = 0;
  for (let i = 0; i < cells; i++) {
    for (let j = 0; j < cells; j++) variance += state.covariance[i * size + j] as number;
  }
  const span = HOT - COLD;
  return { mean: (mean - COLD) / span, sigma: Math.sqrt(variance) / cells / span };
}

describe('a tube whose front has moved unseen', () => {
  it('is found from five thermocouples, charged or discharged, within what it says', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 0.8, max: 3.2, noNaN: true }),
        fc.integer({ min: 10, max: 150 }),
        fc.boolean(),
        fc.boolean(),
        (front_m, scans, charged, stands) => {
          const flux = charged ? 0.5 : -0.5;
          const truth = tubeAt(front_m, scans, flux);
          const readings = readingsOf(truth);
          const state = tubeAt(front_m, 0, 0);
          const off = Math.abs(level(state).mean - level(truth).mean);
          expect(startAlongPath(TUBE, state, readings, drive(stands ? 0 : flux))).toBe(true);
          const found = level(state);
          const error = Math.abs(found.mean - level(truth).mean);
          expect(error).toBeLessThan(2 * found.sigma);
          // Between thermocouples 0.8 m apart a front keeps some room; never as much as it was lost by.
          expect(error).toBeLessThan(Math.max(0.01, off / 5));
          expect(found.sigma).toBeLessThan(0.04);
          const p = denseOf(state.covariance, size);
          expect(leastEigenvalue(p)).toBeGreaterThan(-1e-6);
        },
      ),
      { numRuns: 25, seed: 5 },
    );
  });

  it('is left as it was where no charge or discharge explains the readings', () => {
    const state = tubeAt(2, 0, 0);
    const before = structuredClone(state);
    const values = [COLD, HOT, COLD, HOT, COLD];
    const readings = TUBE.string.thermocouples.map(({ position_m }, sensor) => ({
      position_m,
      value_K: values[sensor] as number,
      sensor,
    }));
    expect(startAlongPath(TUBE, state, readings, drive(0.5))).toBe(false);
    expect(state).toEqual(before);
  });

  it('keeps what is known of its factors, and none of their bearing on the old profile', () => {
    const state = tubeAt(1.5, 60, 0.5);
    const factors = state.further.slice();
    const variance = state.covariance[TUBE.layout.flow * (size + 1)] as number;
    const readings = readingsOf(tubeAt(1.5, 120, 0.5));
    expect(startAlongPath(TUBE, state, readings, drive(0.5))).toBe(true);
    expect(state.further).toEqual(factors);
    expect(state.covariance[TUBE.layout.flow * (size + 1)]).toBe(variance);
    for (let i = 0; i < cells; i++) {
      expect(state.covariance[i * size + TUBE.layout.flow]).toBe(0);
    }
  });
});

describe('thermocouples that stand far apart', () => {
  it('are three or more with more than an eighth of the bed between two', () => {
    const at = (places: number[]) =>
      places.map((position_m, sensor) => ({ position_m, value_K: 300, sensor }));
    expect(isSparse(at([0.4, 1.2, 2, 2.8, 3.6]), LENGTH)).toBe(true);
    expect(isSparse(at([1, 3]), LENGTH)).toBe(false);
    expect(isSparse(at(Array.from({ length: 10 }, (_, i) => 0.2 + 0.4 * i)), LENGTH)).toBe(false);
  });
});
