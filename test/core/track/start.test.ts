import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { blankTube, type StartReading, startTube } from '../../../src/core/track/start.js';
import type { StoreModel } from '../../../src/core/track/storeTracker.js';
import { type TubeModel, type TubeState, tubeTemperatures } from '../../../src/core/track/tube.js';
import { denseOf, leastEigenvalue } from './dense.js';
import { hotStore, modelOf, stringOf } from './plants.js';

const SENSORS = 8;
const CELLS = 30;
const LENGTH = 4;
const DX = LENGTH / CELLS;

function modelWith(groups: readonly (string | null)[]): StoreModel {
  return modelOf(hotStore({ strings: [stringOf('h', SENSORS, LENGTH, { groups })] }));
}

const UNGROUPED = modelWith([null]);
const ONE_CARD = modelWith(['a']);
const TWO_CARDS = modelWith(['a', 'b']);
const HALF_CARDS = modelWith(['a', null]);

const tubeOf = (model: StoreModel): TubeModel => model.tubes[0] as TubeModel;

/** Readings of the string's own thermocouples; those of `values` that are NaN are left out. */
function readingsOf(tube: TubeModel, values: readonly number[]): StartReading[] {
  return tube.string.thermocouples.flatMap(({ position_m }, sensor) => {
    const value_K = values[sensor] as number;
    return Number.isNaN(value_K) ? [] : [{ position_m, value_K, sensor }];
  });
}

function started(tube: TubeModel, readings: readonly StartReading[], inflate = 1): TubeState {
  const state = blankTube(tube);
  startTube(tube, state, readings, inflate);
  return state;
}

const ramp = Array.from({ length: SENSORS }, (_, i) => 700 - 50 * i);
const variance = (tube: TubeModel, state: TubeState, i: number, j = i): number =>
  state.covariance[i * tube.layout.size + j] as number;

describe('a tube that has read nothing', () => {
  it('stands at mid temperature, unsure by half the span', () => {
    const tube = tubeOf(UNGROUPED);
    const state = blankTube(tube);
    for (const t of tubeTemperatures(tube, state, new Float64Array(CELLS))) {
      expect(t).toBeCloseTo((733.15 + 298.15) / 2, 9);
    }
    expect(Math.sqrt(variance(tube, state, 3))).toBeCloseTo((733.15 - 298.15) / 2, 9);
    expect(leastEigenvalue(denseOf(state.covariance, tube.layout.size))).toBeGreaterThan(0);
  });
});

describe('the profile of a start', () => {
  it('is straight between thermocouples and level beyond the outermost', () => {
    const tube = tubeOf(UNGROUPED);
    const t = tubeTemperatures(
      tube,
      started(tube, readingsOf(tube, ramp)),
      new Float64Array(CELLS),
    );
    t.forEach((value, i) => {
      const x = Math.min(LENGTH - 0.25, Math.max(0.25, (i + 0.5) * DX));
      // 50 K every half metre from 700 K at 0.25 m.
      expect(value).toBeCloseTo(700 - 100 * (x - 0.25), 9);
    });
  });

  it('does not depend on the order of the readings', () => {
    const tube = tubeOf(TWO_CARDS);
    const readings = readingsOf(tube, ramp);
    const turned = [...readings].reverse();
    expect(started(tube, turned)).toEqual(started(tube, readings));
  });

  it('is drawn through another string`s readings where its own are too few', () => {
    const tube = tubeOf(UNGROUPED);
    const others = readingsOf(tube, ramp).map((r) => ({ ...r, sensor: -1 }));
    const own = readingsOf(tube, ramp);
    const t = (readings: readonly StartReading[]): Float64Array =>
      tubeTemperatures(tube, started(tube, readings), new Float64Array(CELLS));
    expect(t(others)).toEqual(t(own));
  });

  it('needs two readings', () => {
    const tube = tubeOf(UNGROUPED);
    expect(() => started(tube, readingsOf(tube, ramp).slice(0, 1))).toThrow(
      new RangeError('readings: 1, expected 2 or more'),
    );
  });
});

describe('the covariance of a start', () => {
  const temperatures = fc.array(fc.double({ min: 298, max: 733, noNaN: true }), {
    minLength: SENSORS,
    maxLength: SENSORS,
  });
  const missing = fc.subarray([0, 1, 2, 3, 4, 5, 6, 7], { maxLength: SENSORS - 2 });

  it.each([
    ['no group', UNGROUPED],
    ['one group', ONE_CARD],
    ['two groups in turn', TWO_CARDS],
    ['a group for every second', HALF_CARDS],
  ] as const)('is positive semi-definite and symmetric to the bit: %s', (_, model) => {
    fc.assert(
      fc.property(
        fc.oneof(temperatures, fc.constant(new Array<number>(SENSORS).fill(400))),
        missing,
        fc.constantFrom(1, 2),
        fc.boolean(),
        (values, lost, inflate, foreign) => {
          const tube = tubeOf(model);
          const read = values.map((v, i) => (lost.includes(i) ? Number.NaN : v));
          const readings = readingsOf(tube, read).map((r, i) =>
            foreign && i === 0 ? { ...r, sensor: -1 } : r,
          );
          const state = started(tube, readings, inflate);
          const p = denseOf(state.covariance, tube.layout.size);
          p.forEach((row, i) => {
            row.forEach((value, j) => {
              expect(value).toBe(p[j]?.[i]);
            });
          });
          // Each part is a covariance; round-off of a sum of three, relative to the diagonal.
          expect(leastEigenvalue(p)).toBeGreaterThan(-1e-10);
        },
      ),
      { numRuns: 12 },
    );
  });

  it('couples each cell with the offsets of the readings drawn through it, by their weights', () => {
    const tube = tubeOf(UNGROUPED);
    const state = started(tube, readingsOf(tube, ramp));
    const { offset } = tube.layout;
    const sigma2 = tube.estimator.offset_sigma_K ** 2;
    for (let i = 0; i < CELLS; i++) {
      const place = ((i + 0.5) * DX - 0.25) / 0.5;
      for (let s = 0; s < SENSORS; s++) {
        const weight = Math.max(0, 1 - Math.abs(Math.min(SENSORS - 1, Math.max(0, place)) - s));
        // A profile drawn through a reading with offset o is too high by o: cov = -w sigma^2.
        expect(variance(tube, state, i, offset + s)).toBeCloseTo(-weight * sigma2, 9);
      }
    }
  });

  it('couples cells with the offset of a group through that group`s readings alone', () => {
    const tube = tubeOf(TWO_CARDS);
    const state = started(tube, readingsOf(tube, ramp));
    const { group } = tube.layout;
    const sigma2 = tube.estimator.group_offset_sigma_K ** 2;
    for (let i = 0; i < CELLS; i++) {
      const place = Math.min(SENSORS - 1, Math.max(0, ((i + 0.5) * DX - 0.25) / 0.5));
      const fromA = Math.floor(place) % 2 === 0 ? 1 - (place % 1) : place % 1;
      expect(variance(tube, state, i, group)).toBeCloseTo(-fromA * sigma2, 9);
      expect(variance(tube, state, i, group + 1)).toBeCloseTo(-(1 - fromA) * sigma2, 9);
    }
  });

  it('knows what a thermocouple reads, whatever its offsets: they cancel against the profile', () => {
    // With 40 cells each thermocouple stands at a cell's centre.
    const tube = tubeOf(
      modelOf(hotStore({ strings: [stringOf('h', 8, 4, { groups: ['a'] })] }), { cells: 40 }),
    );
    const state = started(tube, readingsOf(tube, ramp));
    const { offset, group } = tube.layout;
    const noise = tube.estimator.reading_sigma_K ** 2;
    for (let s = 0; s < SENSORS; s++) {
      const seen = [2 + 5 * s, offset + s, group];
      let sum = 0;
      for (const i of seen) for (const j of seen) sum += variance(tube, state, i, j);
      // T + o + g was read, but for the noise of one reading and room of less than half a kelvin.
      expect(sum).toBeGreaterThanOrEqual(noise);
      expect(sum).toBeLessThan(noise + 0.5 ** 2);
      expect(variance(tube, state, 2 + 5 * s)).toBeGreaterThan(tube.estimator.offset_sigma_K ** 2);
    }
  });

  it('is less sure between thermocouples with a steep profile and beyond the outermost', () => {
    const tube = tubeOf(UNGROUPED);
    const steep = [700, 700, 700, 700, 300, 300, 300, 300];
    const state = started(tube, readingsOf(tube, steep));
    const sigma = (x: number): number => Math.sqrt(variance(tube, state, Math.round(x / DX - 0.5)));
    // The step of 400 K lies between 1.75 m and 2.25 m.
    expect(sigma(2)).toBeGreaterThan(50);
    expect(sigma(1)).toBeLessThan(5);
    expect(sigma(0.06)).toBeGreaterThan(5);
    expect(sigma(3.94)).toBeGreaterThan(5);
  });

  it('is four times as large in all that the readings gave when re-acquiring with inflation 2', () => {
    const tube = tubeOf(ONE_CARD);
    const once = started(tube, readingsOf(tube, ramp));
    const twice = started(tube, readingsOf(tube, ramp), 2);
    const { offset, group } = tube.layout;
    for (const i of [0, 7, 15, 29, offset, offset + 3, group]) {
      expect(variance(tube, twice, i) / variance(tube, once, i)).toBeCloseTo(4, 9);
      expect(variance(tube, twice, i, offset) / (variance(tube, once, i, offset) || 1)).toBeCloseTo(
        variance(tube, once, i, offset) === 0 ? 0 : 4,
        9,
      );
    }
  });
});

describe('a restart', () => {
  it('keeps what is known of the factors and drops their ties to the old profile', () => {
    const tube = tubeOf(UNGROUPED);
    const state = started(tube, readingsOf(tube, ramp));
    const { flow, transfer, share, size, cells, offset } = tube.layout;
    const set = (i: number, j: number, value: number): void => {
      state.covariance[i * size + j] = value;
      state.covariance[j * size + i] = value;
    };
    state.further[flow - cells] = 0.03;
    state.further[transfer - cells] = -0.2;
    state.further[offset - cells] = 2;
    set(flow, flow, 1e-4);
    set(flow, transfer, 2e-4);
    set(4, flow, 0.02);
    startTube(tube, state, readingsOf(tube, ramp), 2);
    expect(state.further[flow - cells]).toBe(0.03);
    expect(state.further[transfer - cells]).toBe(-0.2);
    expect(variance(tube, state, flow)).toBe(1e-4);
    expect(variance(tube, state, flow, transfer)).toBe(2e-4);
    expect(variance(tube, state, 4, flow)).toBe(0);
    expect(variance(tube, state, 4, share)).toBe(0);
    // An offset was known by the profile that is gone.
    expect(state.further[offset - cells]).toBe(0);
  });
});
