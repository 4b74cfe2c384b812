import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { storeEnergy } from '../../../src/core/track/storeEnergy.js';
import { rejectedSensors } from '../../../src/core/track/storeEstimate.js';
import { startStore, stepStore } from '../../../src/core/track/storeTracker.js';
import type { TubeDrive } from '../../../src/core/track/tube.js';
import { mulberry } from '../../support/random.js';
import { hotBed, hotStore, modelOf, stringOf } from './plants.js';
import { Bed } from './randomStore.js';

const SENSORS = 10;
const CHARGE: TubeDrive = {
  massFlux_kg_m2s: 0.5,
  inlet_K: 733,
  inletSigma_K: 0,
  ambient_K: 283.15,
  dt_s: 60,
  travelSigma_m: 0,
};
const STANDING: TubeDrive = { ...CHARGE, massFlux_kg_m2s: 0 };

/** Spoils the readings of a scan; `sound` is as they were. */
type Fault = (values: Float64Array, sound: Float64Array, scan: number) => void;

/**
 * A bed of 4 m that is charged from a quarter on, and the estimator that watches it with strings of
 * ten; a front goes about 0.6 m in an hour.
 */
function watched(
  options: {
    strings?: number;
    groups?: readonly (string | null)[];
    seed?: number;
    at?: number;
  } = {},
) {
  const { strings = 1, seed = 5, at = 0.25 } = options;
  const bedOf = hotBed({
    wall_loss_W_m2K: 0,
    end_loss_W_m2K: { charge_inlet: 0, discharge_inlet: 0 },
  });
  const model = modelOf(
    hotStore({
      bed: bedOf,
      strings: Array.from({ length: strings }, (_, k) =>
        stringOf(`s${k}`, SENSORS, 4, {
          radius_m: 0.3 * k,
          area_share: 1 / strings,
          groups: options.groups ?? [`card${k}`],
        }),
      ),
    }),
  );
  const state = startStore(model);
  const bed = new Bed(model, mulberry(seed), at);
  let scan = 0;
  const run = (scans: number, fault: Fault = () => undefined, drive = CHARGE): void => {
    for (let n = 0; n < scans; n++) {
      bed.step(drive);
      const sound = bed.readings();
      const values = sound.slice();
      fault(values, sound, n);
      scan++;
      stepStore(model, state, scan === 1 ? null : drive, values, scan * 60_000, 0);
    }
  };
  const rejected = () => rejectedSensors(model, state);
  const verdicts = (): string[] => rejected().map((r) => `${r.id} ${r.verdict}`);
  return { model, state, run, rejected, verdicts, soc: () => storeEnergy(model, state).soc };
}

/** What a run comes out with when nothing is wrong. */
function sound(options: Parameters<typeof watched>[0], scans: readonly [number, TubeDrive][]) {
  const store = watched(options);
  for (const [n, drive] of scans) store.run(n, undefined, drive);
  return store;
}

const add =
  (by: number, at: (i: number) => boolean): Fault =>
  (values) => {
    for (let i = 0; i < values.length; i++) if (at(i)) values[i] = (values[i] as number) + by;
  };

describe('a step of a card or cold junction', () => {
  it('is named within five scans and costs little, whatever its size and side', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 4, max: 15, noNaN: true }),
        fc.constantFrom(-1, 1),
        fc.integer({ min: 0, max: 2 }),
        (by, side, card) => {
          const store = watched({ strings: 3 });
          store.run(90);
          const own = (i: number): boolean => Math.floor(i / SENSORS) === card;
          store.run(5, add(side * by, own));
          const names = Array.from({ length: SENSORS }, (_, i) => `s${card}_${i + 1} group_fault`);
          expect(store.verdicts()).toEqual(names);
          store.run(115, add(side * by, own));
          expect(store.verdicts()).toEqual(names);
          expect(store.state.used).toBe(3 * SENSORS);
          const clean = sound({ strings: 3 }, [[210, CHARGE]]).soc();
          expect(Math.abs(store.soc() - clean)).toBeLessThan(0.005);
          // Mended: the group is back within its class.
          store.run(3);
          expect(store.verdicts()).toEqual([]);
        },
      ),
      { seed: 6, numRuns: 4 },
    );
  });

  it('stays listed when one of its readings is missing for a scan', () => {
    const store = watched({ strings: 3 });
    const card = add(8, (i) => i < SENSORS);
    store.run(90);
    store.run(5, card);
    const before = store.rejected();
    store.run(1, (values, was, n) => {
      card(values, was, n);
      values[3] = Number.NaN;
    });
    expect(store.verdicts()).toContain('s0_4 open');
    store.run(1, card);
    expect(store.rejected()).toEqual(before);
  });

  it('is seen where the group is all of the store', () => {
    const store = watched();
    store.run(90);
    store.run(
      120,
      add(6, () => true),
    );
    expect(new Set(store.rejected().map((r) => r.verdict))).toEqual(new Set(['group_fault']));
    expect(store.rejected()).toHaveLength(SENSORS);
    expect(store.rejected()[0]?.evidence).toMatch(/card0 read [56]\.\d K too high together/);
    expect(Math.abs(store.soc() - sound({}, [[210, CHARGE]]).soc())).toBeLessThan(0.005);
  });

  it('is seen where two cards take turns along all strings', () => {
    const store = watched({ strings: 2, groups: ['one', 'two'] });
    store.run(90);
    store.run(
      10,
      add(-5, (i) => i % 2 === 1),
    );
    const ids = store.verdicts();
    expect(ids).toHaveLength(SENSORS);
    for (const id of ids) expect(id).toMatch(/_(2|4|6|8|10) group_fault$/);
  });

  it('is no group fault that a front makes which comes early', () => {
    const store = watched({ strings: 3 });
    // A quarter more flow than metered.
    store.run(90, undefined, CHARGE);
    store.run(150, undefined, { ...CHARGE, massFlux_kg_m2s: 0.6 });
    expect(store.verdicts().filter((v) => v.endsWith('group_fault'))).toEqual([]);
  });
});

describe('two thermocouples that were exchanged', () => {
  const exchange =
    (a: number, b: number): Fault =>
    (values, was) => {
      values[a] = was[b] as number;
      values[b] = was[a] as number;
    };

  it.each([
    [4, 6, 'from the first scan on', 0],
    [4, 6, 'later', 60],
    [5, 6, 'next to each other', 60],
  ])('are named as %i and %i, each with the other: %s', (a, b, _, from) => {
    const store = watched();
    store.run(from);
    store.run(300 - from, exchange(a, b));
    const found = store.rejected().filter((r) => r.verdict === 'swapped');
    expect(found.map((r) => r.id)).toEqual([`s0_${a + 1}`, `s0_${b + 1}`]);
    expect(found[0]?.evidence).toContain(`s0_${b + 1}`);
    expect(found[1]?.evidence).toContain(`s0_${a + 1}`);
    expect(store.verdicts()).toHaveLength(2);
  });
});

describe('a topmost thermocouple that the bed has left', () => {
  it('reads as the gas that enters there, and is uncovered, not off', () => {
    const store = watched({ at: -0.3 });
    store.run(60, undefined, STANDING);
    // It cannot be told while junctions settle to the flow, for nine minutes.
    store.run(18, (values, was) => {
      values[0] = CHARGE.inlet_K + (was[9] as number) - 298.15;
    });
    expect(store.verdicts()).toEqual(['s0_1 uncovered']);
    expect(store.rejected()[0]?.evidence).toMatch(/like the gas/);
  });
});

describe('a thermocouple that drifted by 4.5 K', () => {
  it('is left out while that lasts, and used again half an hour after it was mended', () => {
    // The front has passed it: the gas that enters tells the rock there well.
    const store = watched();
    const drifted =
      (at: (n: number) => number): Fault =>
      (values, _, n) => {
        values[1] = (values[1] as number) + at(n);
      };
    store.run(270);
    store.run(
      240,
      drifted((n) => Math.min(4.5, n / 40)),
    );
    expect(store.verdicts()).toEqual(['s0_2 drifting']);
    store.run(
      240,
      drifted(() => 4.5),
    );
    expect(store.verdicts()).toEqual(['s0_2 drifting']);
    store.run(30);
    expect(store.verdicts()).toEqual([]);
    expect(store.state.used).toBe(SENSORS);
  });
});

describe('a loose contact', () => {
  it('is an outlier from its third wild reading within the hour, and quiet for an hour ends it', () => {
    const store = watched();
    const wild: Fault = (values, _, n) => {
      if (n % 15 === 7) values[7] = (values[7] as number) + 60;
    };
    store.run(60, undefined, STANDING);
    store.run(28, wild, STANDING);
    expect(store.verdicts()).toEqual([]);
    store.run(17, wild, STANDING);
    expect(store.verdicts()).toEqual(['s0_8 outlier']);
    store.run(50, undefined, STANDING);
    expect(store.verdicts()).toEqual(['s0_8 outlier']);
    store.run(15, undefined, STANDING);
    expect(store.verdicts()).toEqual([]);
  });
});

describe('a sound store', () => {
  it('has nobody named over charge, standing and discharge', () => {
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 1e6 }), (seed) => {
        const discharge: TubeDrive = { ...CHARGE, massFlux_kg_m2s: -0.5, inlet_K: 298 };
        const store = watched({ strings: 2, seed });
        for (const [n, drive] of [
          [150, CHARGE],
          [60, STANDING],
          [180, discharge],
          [120, CHARGE],
        ] as const) {
          store.run(n, undefined, drive);
          expect(store.verdicts()).toEqual([]);
        }
      }),
      { seed: 8, numRuns: 5 },
    );
  });
});
