import { describe, expect, it } from 'vitest';
import type { Direction } from '../../../../src/core/definitions.js';
import { FRONT_TRAVEL } from '../../../../src/core/watch/indicators/frontTravel.js';
import { normals } from '../normals.js';
import { balanceOf, type Moment, unsound, watchScript } from './filter.js';

const RUN_H = 6;

/** Charges and discharges of 6 h in turn; what each run's balance tells of either store in its second half. */
function runs(log: (run: number, store: string) => number, seed = 1, sigma = 0.007) {
  const draw = normals(seed);
  const told = new Map<string, number>();
  const toldOf = (run: number, store: string): number => {
    const key = `${run} ${store}`;
    if (!told.has(key)) told.set(key, log(run, store) + sigma * draw());
    return told.get(key)!;
  };
  const directionOf = (run: number): Direction => (run % 2 === 0 ? 'charge' : 'discharge');
  return (hour: number): Moment => {
    const run = Math.floor(hour / RUN_H);
    const into = hour - run * RUN_H;
    const balance = (store: string) => {
      const last = (r: number, age_s: number) =>
        r < 0 ? {} : { [directionOf(r)]: { log: toldOf(r, store), variance: sigma ** 2, age_s } };
      const before = last(run - 1, into * 3600 + 60);
      const own = into >= RUN_H / 2 ? last(run, 0) : last(run - 2, (into + RUN_H) * 3600);
      return balanceOf(directionOf(run), { ...before, ...own });
    };
    return { mode: directionOf(run), balances: { hot: balance('hot'), cold: balance('cold') } };
  };
}

describe('travel per metered kilogram', () => {
  it('of a sound meter is never off, whatever its constant error', () => {
    for (const seed of [1, 2, 3]) {
      const { found, views } = watchScript(
        FRONT_TRAVEL,
        40 * RUN_H,
        runs(() => 0.03, seed),
        { dt_s: 1800 },
      );
      expect(found).toEqual({});
      expect(views.map((v) => v.state)).toEqual(['normal', 'normal']);
    }
  });

  it('takes one value a run, at its end', () => {
    const times: (string | null)[] = [];
    watchScript(
      FRONT_TRAVEL,
      3 * RUN_H + 1,
      runs(() => 0),
      {
        dt_s: 1800,
        each: (_, [hot]) => {
          if (times.at(-1) !== hot!.time) times.push(hot!.time);
        },
      },
    );
    expect(times.length).toBe(1 + 3);
  });

  it('tells a meter that steps after two runs, and that both stores moved alike', () => {
    for (const seed of [1, 2, 3]) {
      const { found, of, views } = watchScript(
        FRONT_TRAVEL,
        8.1 * RUN_H,
        runs((run) => (run < 6 ? -0.01 : 0.06), seed),
        { dt_s: 1800 },
      );
      expect(found).toEqual({ hot: 8 * RUN_H, cold: 8 * RUN_H });
      expect(of('hot').sentence).toMatch(/The other store moved alike \(cold \+\d/);
      expect(of('hot').sentence).toMatch(/the flow meter reads too little/);
      expect(views.flatMap(unsound)).toEqual([]);
    }
  });

  it('tells where one store alone moved', () => {
    const { found, of } = watchScript(
      FRONT_TRAVEL,
      8.1 * RUN_H,
      runs((run, store) => (run < 6 || store === 'cold' ? 0 : -0.08)),
      { dt_s: 1800 },
    );
    expect(Object.keys(found)).toEqual(['hot']);
    expect(of('hot').sentence).toMatch(/did not move alike/);
    expect(of('hot').limit).toBeLessThan(1);
  });

  it('takes nothing from a run whose balance was dropped on the way', () => {
    const script = runs(() => 0);
    const { views } = watchScript(
      FRONT_TRAVEL,
      3 * RUN_H,
      (hour) => {
        const into = hour % RUN_H;
        // Told for an hour, then dropped as where the meter was found to have changed.
        if (into < 4) return script(hour);
        const none = balanceOf(null, {});
        return { mode: 'charge', balances: { hot: none, cold: none } };
      },
      { dt_s: 1800 },
    );
    for (const view of views) expect(view).toMatchObject({ reason: 'not_exercised', value: null });
  });
});
