import { describe, expect, it } from 'vitest';
import { enthalpyAt, temperatureAt } from '../../../src/core/bed/tables.js';
import { blankTube } from '../../../src/core/track/start.js';
import {
  createTubeScratch,
  predictTube,
  setTubeTemperatures,
  type TubeDrive,
  type TubeModel,
  type TubeState,
  tubeTemperatures,
} from '../../../src/core/track/tube.js';
import { mulberry } from '../../support/random.js';
import { type Dense, denseOf, leastEigenvalue, plus, product, transposed } from './dense.js';
import { hotStore, modelOf, stringOf } from './plants.js';

const CELLS = 20;
const DRIVE: TubeDrive = {
  massFlux_kg_m2s: 0.5,
  inlet_K: 720.3,
  inletSigma_K: 0,
  ambient_K: 283.15,
  dt_s: 60,
  travelSigma_m: 0,
};

function tubeOf(): TubeModel {
  const string = stringOf('h', 4, 4, { groups: ['a', 'b'] });
  return modelOf(hotStore({ strings: [string] }), { cells: CELLS }).tubes[0] as TubeModel;
}

/** A tube with a front at mid length, factors off their priors and a random covariance A A'. */
function tubeInUse(model: TubeModel, seed: number): TubeState {
  const random = mulberry(seed);
  const state = blankTube(model);
  const { cells, size } = model.layout;
  const t = Float64Array.from({ length: cells }, (_, i) => {
    const x = (i + 0.5) / cells;
    return 515 - 200 * Math.tanh((x - 0.5) / 0.15) + 3 * random();
  });
  setTubeTemperatures(model, state, t);
  for (let k = 0; k < state.further.length; k++) state.further[k] = 0.1 * (random() - 0.5);
  const a: Dense = Array.from({ length: size }, (_, i) =>
    Array.from({ length: size }, () => (i < cells ? 5 : 0.3) * (random() - 0.5)),
  );
  const p = product(a, transposed(a));
  for (let i = 0; i < size; i++) {
    for (let j = 0; j <= i; j++) {
      state.covariance[i * size + j] = p[i]?.[j] as number;
      state.covariance[j * size + i] = p[i]?.[j] as number;
    }
  }
  return state;
}

function predicted(model: TubeModel, state: TubeState, drive: TubeDrive): TubeState {
  const next = structuredClone(state);
  predictTube(model, next, drive, createTubeScratch(model.layout));
  return next;
}

/** All states after a step of the mean: cell temperatures and further states. */
function mean(model: TubeModel, state: TubeState): number[] {
  const t = tubeTemperatures(model, state, new Float64Array(model.layout.cells));
  return [...t, ...state.further];
}

/** F of the whole step by central differences of the mean alone. */
function stepMatrix(model: TubeModel, state: TubeState, drive: TubeDrive): Dense {
  const { cells, size } = model.layout;
  const columns = Array.from({ length: size }, (_, k) => {
    // 1e-5 K: small against a table segment (0.7 K), large against the round-off of T (1e-13 K).
    const by = 1e-5;
    const moved = (sign: number): number[] => {
      const other = structuredClone(state);
      if (k < cells) {
        const t = temperatureAt(model.tables, other.enthalpy[k] as number) + sign * by;
        other.enthalpy[k] = enthalpyAt(model.tables, t);
      } else other.further[k - cells] = (other.further[k - cells] as number) + sign * by;
      return mean(model, predicted(model, other, drive));
    };
    const up = moved(1);
    const down = moved(-1);
    return up.map((v, i) => (v - (down[i] as number)) / (2 * by));
  });
  return transposed(columns);
}

/** Q: what a step makes of a covariance of zero; the process noise depends on the mean alone. */
function noise(model: TubeModel, state: TubeState, drive: TubeDrive): Dense {
  const certain = structuredClone(state);
  certain.covariance.fill(0);
  return denseOf(predicted(model, certain, drive).covariance, model.layout.size);
}

const CASES: readonly (readonly [string, Partial<TubeDrive>])[] = [
  ['charging', {}],
  ['discharging', { massFlux_kg_m2s: -0.4, inlet_K: 305.2 }],
  ['standing', { massFlux_kg_m2s: 0 }],
  ['a long step in parts', { dt_s: 1500 }],
  ['an inlet that is only assumed', { inletSigma_K: 15 }],
  ['an unknown travel', { massFlux_kg_m2s: -0.1, inlet_K: 300, travelSigma_m: 0.1 }],
];

describe('predicting a tube', () => {
  it.each(CASES)('makes F P F` + Q of its covariance: %s', (_, over) => {
    const model = tubeOf();
    const drive = { ...DRIVE, ...over };
    const state = tubeInUse(model, 3);
    // The flow has run for a while: no jump of the gas lag, which would loosen the places.
    state.gasLag_m.set(predicted(model, state, drive).gasLag_m);
    const { size } = model.layout;
    const f = stepMatrix(model, state, drive);
    const p = denseOf(state.covariance, size);
    const expected = plus(product(product(f, p), transposed(f)), noise(model, state, drive));
    const found = denseOf(predicted(model, state, drive).covariance, size);
    // The columns of flow and heat transfer are one-sided differences with a relative step of 1e-4
    // across table segments whose heat capacities differ by a few 1e-4; all else is exact. So each
    // element may be off by about 1e-3 of the two sigmas that it joins.
    for (let i = 0; i < size; i++) {
      for (let j = 0; j < size; j++) {
        const scale = Math.sqrt((expected[i]?.[i] as number) * (expected[j]?.[j] as number));
        const off = Math.abs((found[i]?.[j] as number) - (expected[i]?.[j] as number));
        expect(off, `element ${i}, ${j}`).toBeLessThan(1e-3 * scale);
      }
    }
  });

  it.each(CASES)('adds a noise that is a covariance: %s', (_, over) => {
    const model = tubeOf();
    const q = noise(model, tubeInUse(model, 4), { ...DRIVE, ...over });
    for (let i = 0; i < q.length; i++) {
      expect(q[i]?.[i]).toBeGreaterThanOrEqual(0);
      for (let j = 0; j < i; j++) expect(q[i]?.[j]).toBe(q[j]?.[i]);
    }
    // The correlation of shape noise is a Gaussian cut off at 2.5 lengths, where it has fallen to
    // exp(-3.125) = 0.044: the cut alone may cost an eigenvalue a few hundredths of the diagonal.
    expect(leastEigenvalue(q)).toBeGreaterThan(-0.05);
  });

  it('adds the same noise in one step as in ten, to first order in the step', () => {
    const model = tubeOf();
    const state = tubeInUse(model, 5);
    state.covariance.fill(0);
    const whole = predicted(model, state, { ...DRIVE, dt_s: 60 });
    let parts = state;
    for (let n = 0; n < 10; n++) parts = predicted(model, parts, { ...DRIVE, dt_s: 6 });
    const { size, cells, position, sensors } = model.layout;
    const variance = (s: TubeState, i: number): number => s.covariance[i * size + i] as number;
    for (let i = 0; i < size; i++) {
      // Places are loosened by jumps of the gas lag, not by time.
      if (i >= position && i < position + sensors) continue;
      const a = variance(whole, i);
      const b = variance(parts, i);
      // A front that travels 1 % of a cell per part has its noise spread with it; flow noise is
      // white over ten minutes, so both steps are short against it. Parameters walk exactly alike.
      const room = i < cells ? 0.05 * Math.max(a, 1e-3) : 1e-9 * a;
      expect(Math.abs(a - b), `state ${i}`).toBeLessThanOrEqual(room);
    }
  });

  it('keeps offsets within their prior, however long nothing is read', () => {
    const model = tubeOf();
    let state = blankTube(model);
    const { size, offset, group } = model.layout;
    for (let n = 0; n < 50; n++) {
      state = predicted(model, state, { ...DRIVE, massFlux_kg_m2s: 0, dt_s: 86400 });
    }
    // First-order Gauss-Markov: the prior's variance is its stationary one.
    const sigma = (i: number): number => Math.sqrt(state.covariance[i * size + i] as number);
    expect(sigma(offset)).toBeCloseTo(model.estimator.offset_sigma_K, 9);
    expect(sigma(group)).toBeCloseTo(model.estimator.group_offset_sigma_K, 9);
  });

  it('grows less sure of the profile while nothing is read, and no surer of any factor', () => {
    const model = tubeOf();
    const state = tubeInUse(model, 6);
    const next = predicted(model, state, { ...DRIVE, massFlux_kg_m2s: 0, dt_s: 6 * 3600 });
    const { size, flow, transfer, share } = model.layout;
    for (const i of [flow, transfer, share]) {
      expect(next.covariance[i * size + i]).toBeGreaterThanOrEqual(
        state.covariance[i * size + i] as number,
      );
    }
  });

  it('has the gas leave at the temperature of the bed`s end, and no outlet while standing', () => {
    const model = tubeOf();
    const state = tubeInUse(model, 7);
    const end = (at: number): number => temperatureAt(model.tables, state.enthalpy[at] as number);
    const out = (flux: number): number =>
      predicted(model, state, { ...DRIVE, massFlux_kg_m2s: flux }).outlet_K;
    // The plateaus at the ends are flat to a few kelvin over the gas-to-rock lag.
    expect(Math.abs(out(0.5) - end(CELLS - 1))).toBeLessThan(5);
    expect(Math.abs(out(-0.4) - end(0))).toBeLessThan(5);
    expect(out(0)).toBeNaN();
  });

  it('is less sure of a junction`s place once the flow has turned, and not while it runs on', () => {
    const model = tubeOf();
    const { size, position, sensors } = model.layout;
    const places = (s: TubeState): number[] =>
      Array.from(
        { length: sensors },
        (_, k) => s.covariance[(position + k) * (size + 1)] as number,
      );
    const running = predicted(model, blankTube(model), DRIVE);
    const on = predicted(model, running, DRIVE);
    const turned = predicted(model, on, { ...DRIVE, massFlux_kg_m2s: -0.5, inlet_K: 300 });
    places(on).forEach((v, k) => {
      expect(v / (places(running)[k] as number)).toBeCloseTo(1, 3);
      expect(places(turned)[k]).toBeGreaterThan(1.1 * v);
    });
  });

  it('turns the gas-to-rock lag with the flow and has none while standing', () => {
    const model = tubeOf();
    const state = tubeInUse(model, 8);
    const lag = (flux: number): Float64Array =>
      predicted(model, state, { ...DRIVE, massFlux_kg_m2s: flux }).gasLag_m;
    const forward = lag(0.5);
    const backward = lag(-0.5);
    forward.forEach((l, i) => {
      expect(l).toBeGreaterThan(0);
      expect(backward[i]).toBeLessThan(0);
    });
    expect(lag(0).every((l) => l === 0)).toBe(true);
  });
});
