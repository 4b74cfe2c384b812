import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { enthalpyAt, temperatureAt } from '../../../src/core/bed/tables.js';
import {
  emptyReading,
  observe,
  predictReading,
  projectReading,
  type ReadingModel,
  readingVariance,
} from '../../../src/core/track/measurement.js';
import { forwardSolve } from '../../../src/core/track/readingAlgebra.js';
import { type AcceptedReading, applyReadings } from '../../../src/core/track/readingUpdate.js';
import { blankTube } from '../../../src/core/track/start.js';
import {
  setTubeTemperatures,
  type TubeModel,
  type TubeState,
  tubeTemperatures,
} from '../../../src/core/track/tube.js';
import { mulberry } from '../../support/random.js';
import { type Dense, denseOf, inverse, plus, product, transposed } from './dense.js';
import { hotStore, modelOf, stringOf } from './plants.js';

const CELLS = 20;
const SENSORS = 6;

const MODEL = modelOf(
  // Three groups make 41 states: the update's tiles of two rows by four columns do not fit evenly.
  hotStore({ strings: [stringOf('h', SENSORS, 4, { groups: ['a', 'b', null, 'a', 'b', 'c'] })] }),
  { cells: CELLS },
);

function tubeOf(): TubeModel {
  return MODEL.tubes[0] as TubeModel;
}

/** A front, a gas lag up to the bed's length, gas that enters, further states and a covariance A A' + D, all random. */
function randomTube(model: TubeModel, seed: number): TubeState {
  const random = mulberry(seed);
  const state = blankTube(model);
  const { cells, size, share, position, sensors } = model.layout;
  const middle = 0.2 + 0.6 * random();
  setTubeTemperatures(
    model,
    state,
    Float64Array.from(
      { length: cells },
      (_, i) => 515 - 200 * Math.tanh(((i + 0.5) / cells - middle) / 0.2) + random(),
    ),
  );
  state.gasLag_m.fill((random() < 0.5 ? 0.4 : 8) * (random() - 0.5));
  state.gas = {
    inlet_K: 300 + 430 * random(),
    inletSigma_K: 0,
    flow: 0.1 * (random() - 0.5),
    transfer: 0.5 * (random() - 0.5),
    flowSlope: 0.4 + 0.6 * random(),
  };
  for (let k = 0; k < state.further.length; k++) state.further[k] = random() - 0.5;
  for (let k = 0; k < sensors; k++) state.further[position + k - cells] = 0.02 * (random() - 0.5);
  state.further[share - cells] = random() - 0.3;
  const scale = (i: number): number => (i < cells ? 3 : i === share ? 0.2 : 0.5);
  const a: Dense = Array.from({ length: size }, (_, i) =>
    Array.from({ length: 8 }, () => scale(i) * (random() - 0.5)),
  );
  const p = product(a, transposed(a));
  for (let i = 0; i < size; i++) {
    for (let j = 0; j <= i; j++) {
      const value = (p[i]?.[j] as number) + (i === j ? (0.3 * scale(i)) ** 2 : 0);
      state.covariance[i * size + j] = value;
      state.covariance[j * size + i] = value;
    }
  }
  return state;
}

/** Gas that enters, with states of 0 for flow and transfer. */
const gasAt = (inlet_K: number, flowSlope = 0, inletSigma_K = 0) => ({
  inlet_K,
  inletSigma_K,
  flow: 0,
  transfer: 0,
  flowSlope,
});

function modelOfReading(model: TubeModel, state: TubeState, sensor: number): ReadingModel {
  const out = emptyReading(model.layout.cells);
  predictReading(model, state, sensor, out);
  return out;
}

/** H of one sensor as a dense row, from `observe` on unit vectors. */
function rowOf(model: TubeModel, sensor: number, reading: ReadingModel): number[] {
  const unit = new Float64Array(model.layout.size);
  return Array.from(unit, (_, k) => {
    unit.fill(0);
    unit[k] = 1;
    return observe(model, sensor, reading, unit);
  });
}

function statesOf(model: TubeModel, state: TubeState): number[] {
  const t = tubeTemperatures(model, state, new Float64Array(model.layout.cells));
  return [...t, ...state.further];
}

/** All sensors of `which` read `innovation` more than predicted. */
function accepted(model: TubeModel, state: TubeState, which: number[], random: () => number) {
  return which.map((sensor): AcceptedReading => {
    const reading = modelOfReading(model, state, sensor);
    const v = new Float64Array(model.layout.size);
    projectReading(model, state, sensor, reading, v);
    const innovation_K = 4 * (random() - 0.5);
    const variance_K2 = readingVariance(model, reading) * (1 + random());
    return { sensor, reading, v, innovation_K, variance_K2 };
  });
}

const seeds = fc.integer({ min: 1, max: 1e6 });
const sensors = fc.subarray([0, 1, 2, 3, 4, 5], { minLength: 1 });

describe('what a thermocouple should read', () => {
  it('is the rock at its place, straight between cell centres, plus its offsets', () => {
    const model = tubeOf();
    const state = blankTube(model);
    const t = Float64Array.from({ length: CELLS }, (_, i) => 300 + 10 * i);
    setTubeTemperatures(model, state, t);
    const { cells, offset, group, share } = model.layout;
    state.further[share - cells] = 0;
    state.further[offset + 2 - cells] = 1.5;
    state.further[offset + 3 - cells] = 0.5;
    state.further[group - cells] = 0.25;
    const dx = 4 / CELLS;
    const rock = (sensor: number): number =>
      300 +
      10 * ((model.string.thermocouples[sensor] as { position_m: number }).position_m / dx - 0.5);
    // A straight profile: nothing but the tables' round-off.
    expect(modelOfReading(model, state, 2).value_K).toBeCloseTo(rock(2) + 1.5, 9);
    // Sensors 0 and 3 share group a.
    expect(modelOfReading(model, state, 3).value_K).toBeCloseTo(rock(3) + 0.5 + 0.25, 9);
    expect(modelOfReading(model, state, 1).value_K).toBeCloseTo(rock(1), 9);
  });

  it('is, far from the inlet, the rock s lags upstream for the share s of gas that it sees', () => {
    const model = tubeOf();
    const state = blankTube(model);
    setTubeTemperatures(
      model,
      state,
      Float64Array.from({ length: CELLS }, (_, i) => 700 - 15 * i),
    );
    const { cells, share } = model.layout;
    state.further[share - cells] = 0.4;
    const still = modelOfReading(model, state, 3).value_K;
    state.gas = gasAt(500);
    state.gasLag_m.fill(0.1);
    // Charging, hot gas comes from lower x: 0.4 * 0.1 m upstream it is 75 K/m * 0.04 m hotter. Less
    // than a thousandth of it is left out upstream.
    expect(Math.abs(modelOfReading(model, state, 3).value_K - still - 3)).toBeLessThan(0.003);
    state.gasLag_m.fill(-0.1);
    expect(Math.abs(modelOfReading(model, state, 3).value_K - still + 3)).toBeLessThan(0.003);
  });

  it('is, near the inlet, the share s of the gas that has entered and cools by e^(-x/l)', () => {
    const model = tubeOf();
    const { cells, share, inlet, flow, transfer } = model.layout;
    for (const [end, sensor, sign] of [
      ['charge_inlet', 0, 1],
      ['discharge_inlet', SENSORS - 1, -1],
    ] as const) {
      const state = blankTube(model);
      setTubeTemperatures(model, state, new Float64Array(CELLS).fill(400));
      state.gasLag_m.fill(sign * 2);
      state.further[share - cells] = 0.4;
      // As from a state in which nothing is kept of the gas, and where it is not measured.
      expect(modelOfReading(model, state, sensor).value_K).toBeCloseTo(400, 9);
      state.gas = gasAt(Number.NaN);
      expect(modelOfReading(model, state, sensor).value_K).toBeCloseTo(400, 9);
      state.gas = gasAt(500);
      state.further[inlet[end] - cells] = -20;
      const cooled = (lag: number): number => 400 + 0.4 * 80 * Math.exp(-1 / 3 / lag);
      expect(modelOfReading(model, state, sensor).value_K).toBeCloseTo(cooled(2), 9);
      // Twice the transfer makes half the lag; the flow has its own slope.
      state.further[transfer - cells] = Math.LN2;
      expect(modelOfReading(model, state, sensor).value_K).toBeCloseTo(cooled(1), 9);
      state.gas = gasAt(500, 0.5);
      state.further[flow - cells] = Math.log(4);
      expect(modelOfReading(model, state, sensor).value_K).toBeCloseTo(cooled(2), 9);
      // Gas that is assumed is not known better than that.
      const measured = readingVariance(model, modelOfReading(model, state, sensor));
      state.gas = gasAt(500, 0.5, 15);
      const assumed = readingVariance(model, modelOfReading(model, state, sensor));
      expect(assumed - measured).toBeCloseTo((0.4 * Math.exp(-1 / 6) * 15) ** 2, 9);
    }
  });

  it('has the derivative that finite differences give, for every state', () => {
    fc.assert(
      fc.property(seeds, fc.integer({ min: 0, max: SENSORS - 1 }), (seed, sensor) => {
        const model = tubeOf();
        const state = randomTube(model, seed);
        const { cells, size } = model.layout;
        const reading = modelOfReading(model, state, sensor);
        const row = rowOf(model, sensor, reading);
        const { position_m } = model.string.thermocouples[sensor] as { position_m: number };
        const own = state.further[model.layout.position + sensor - cells] as number;
        const place = ((position_m + own) * cells) / 4 - 0.5;
        const weight = place - Math.floor(place);
        // 1e-6: within one straight piece of the profile and one cell of the lag, unless the place
        // lies at the very border of two; such draws are left out.
        const by = 1e-6;
        fc.pre(weight > 1e-4 && weight < 1 - 1e-4);
        for (let k = 0; k < size; k++) {
          const value = (sign: number): number => {
            const other = structuredClone(state);
            if (k < cells) {
              const t = temperatureAt(model.tables, other.enthalpy[k] as number) + sign * by;
              other.enthalpy[k] = enthalpyAt(model.tables, t);
            } else other.further[k - cells] = (other.further[k - cells] as number) + sign * by;
            return modelOfReading(model, other, sensor).value_K;
          };
          const difference = (value(1) - value(-1)) / (2 * by);
          // Round-off of T (1e-13 K) over the step, times a few sums.
          expect(Math.abs(difference - (row[k] as number)), `state ${k}`).toBeLessThan(1e-5);
        }
      }),
      { numRuns: 40 },
    );
  });

  it('projects the covariance as P H` and H P H` do', () => {
    fc.assert(
      fc.property(seeds, fc.integer({ min: 0, max: SENSORS - 1 }), (seed, sensor) => {
        const model = tubeOf();
        const state = randomTube(model, seed);
        const { size } = model.layout;
        const reading = modelOfReading(model, state, sensor);
        const h = [rowOf(model, sensor, reading)];
        const p = denseOf(state.covariance, size);
        const ph = product(p, transposed(h));
        const v = new Float64Array(size);
        const variance = projectReading(model, state, sensor, reading, v);
        const exact = product(h, ph)[0]?.[0] as number;
        expect(Math.abs(variance / exact - 1)).toBeLessThan(1e-10);
        const largest = Math.max(...ph.map((row) => Math.abs(row[0] as number)));
        v.forEach((value, i) => {
          expect(Math.abs(value - (ph[i]?.[0] as number))).toBeLessThan(1e-12 * largest);
        });
      }),
      { numRuns: 40 },
    );
  });

  it('refuses a sensor that the string does not have', () => {
    const model = tubeOf();
    expect(() => modelOfReading(model, blankTube(model), SENSORS)).toThrow(
      new RangeError(`sensor ${SENSORS}: not in this string`),
    );
  });
});

describe('taking readings in', () => {
  it('is the textbook update with a dense gain, P - K H P and x + K (z - h)', () => {
    fc.assert(
      fc.property(seeds, sensors, (seed, which) => {
        const model = tubeOf();
        const state = randomTube(model, seed);
        const { size, cells } = model.layout;
        const readings = accepted(model, state, which, mulberry(seed + 1));
        const x = statesOf(model, state);
        const p = denseOf(state.covariance, size);
        const h = readings.map((r) => rowOf(model, r.sensor, r.reading));
        const r: Dense = readings.map((a, i) =>
          readings.map((_, j) => (i === j ? a.variance_K2 : 0)),
        );
        const pht = product(p, transposed(h));
        const gain = product(pht, inverse(plus(product(h, pht), r)));
        const posterior = plus(p, product(gain, transposed(pht)), -1);
        const moved = product(
          gain,
          readings.map((a) => [a.innovation_K]),
        );
        applyReadings(model, state, readings, new Float64Array(cells));
        // The condition of S is below 1e4 here (signal up to 50 K2 on noise of 0.25 K2), so the two
        // computations may differ by 1e-12 of the prior.
        statesOf(model, state).forEach((value, i) => {
          const exact = (x[i] as number) + (moved[i]?.[0] as number);
          expect(Math.abs(value - exact), `state ${i}`).toBeLessThan(1e-10 * (1 + Math.abs(exact)));
        });
        for (let i = 0; i < size; i++) {
          for (let j = 0; j < size; j++) {
            const room = 1e-11 * Math.sqrt((p[i]?.[i] as number) * (p[j]?.[j] as number));
            const found = state.covariance[i * size + j] as number;
            expect(Math.abs(found - (posterior[i]?.[j] as number))).toBeLessThan(room);
          }
        }
      }),
      { numRuns: 60 },
    );
  });

  it('leaves the covariance symmetric to the bit and no variance larger or below zero', () => {
    fc.assert(
      fc.property(seeds, sensors, (seed, which) => {
        const model = tubeOf();
        const state = randomTube(model, seed);
        const { size } = model.layout;
        const before = Float64Array.from(state.covariance);
        const readings = accepted(model, state, which, mulberry(seed));
        applyReadings(model, state, readings, new Float64Array(CELLS));
        for (let i = 0; i < size; i++) {
          const own = i * size + i;
          expect(state.covariance[own]).toBeGreaterThanOrEqual(0);
          expect(state.covariance[own]).toBeLessThanOrEqual(before[own] as number);
          for (let j = 0; j < i; j++) {
            expect(state.covariance[i * size + j]).toBe(state.covariance[j * size + i]);
          }
        }
      }),
      { numRuns: 60 },
    );
  });

  it('does not depend on the order of the readings beyond round-off', () => {
    const model = tubeOf();
    const forward = randomTube(model, 9);
    const backward = structuredClone(forward);
    const readings = accepted(model, forward, [0, 1, 2, 3, 4, 5], mulberry(10));
    applyReadings(model, forward, readings, new Float64Array(CELLS));
    applyReadings(model, backward, [...readings].reverse(), new Float64Array(CELLS));
    statesOf(model, forward).forEach((value, i) => {
      // As in the dense comparison.
      const other = statesOf(model, backward)[i] as number;
      expect(Math.abs(value - other)).toBeLessThan(1e-10 * (1 + Math.abs(value)));
    });
  });

  it('refuses a factor that does not belong to the readings', () => {
    const rows = [new Float64Array(3), new Float64Array(3)];
    expect(() => forwardSolve(new Float64Array(3), rows, 3)).toThrow(
      new RangeError('factor of 3 numbers: expected 4'),
    );
  });

  it('changes nothing where no reading is accepted', () => {
    const model = tubeOf();
    const state = randomTube(model, 11);
    const before = structuredClone(state);
    applyReadings(model, state, [], new Float64Array(CELLS));
    expect(state).toEqual(before);
  });
});
