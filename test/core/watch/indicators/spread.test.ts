import { describe, expect, it } from 'vitest';
import { SPREAD } from '../../../../src/core/watch/indicators/spread.js';
import { normals } from '../normals.js';
import { type Moment, unsound, watchScript } from './filter.js';

/** A front that goes 0.5 m an hour in the twin, counted anew every 4 m; its ratio about a course. */
function script(ratio: (hour: number) => number, seed = 1, scatter = 0.04) {
  const draw = normals(seed);
  return (hour: number): Moment => {
    const own = { ratio: ratio(hour) * Math.exp(scatter * draw()), sigma: 0.02 };
    return { travelled_m: (0.5 * hour) % 4, spread: { hot: own, cold: { ratio: 1, sigma: 0.02 } } };
  };
}

describe('width against the healthy twin', () => {
  it('is never degraded where it widens and sharpens within what a healthy bed does', () => {
    for (const seed of [1, 2, 3])
      for (const norm of [0.9, 1.15]) {
        const course = (hour: number) => norm * (1 + 0.07 * Math.sin(hour / 2));
        const { found, views } = watchScript(SPREAD, 200, script(course, seed), { dt_s: 900 });
        expect(found).toEqual({});
        expect(views.map((v) => v.state)).toEqual(['normal', 'normal']);
      }
  });

  it('comes from 0.9 to 1 within half a cycle without a word', () => {
    const { found } = watchScript(
      SPREAD,
      100,
      script((h) => Math.min(1, 0.9 + 0.02 * h)),
    );
    expect(found).toEqual({});
  });

  it('is found where it grows beyond the limit over what was healthy for this store', () => {
    for (const seed of [1, 2, 3]) {
      const { found, of } = watchScript(
        SPREAD,
        72,
        script((h) => (h < 48 ? 1.1 : 1.8), seed),
      );
      expect(Object.keys(found)).toEqual(['hot']);
      expect(found.hot! - 48).toBeLessThan(10);
      const view = of('hot');
      expect(view.limit / view.healthy!).toBeCloseTo(1.3, 12);
      expect(view.sentence).toMatch(/times as wide as the healthy twin's, healthy is 1\.\d\d/);
      expect(unsound(view)).toEqual([]);
    }
  });

  it('is found where it was gross from the start, against the twin', () => {
    const { found } = watchScript(
      SPREAD,
      36,
      script(() => 2.6),
    );
    expect(Object.keys(found)).toEqual(['hot']);
  });

  it('never calls steep what is at its limit or beyond, decided or not', () => {
    const told = new Set<string>();
    watchScript(
      SPREAD,
      72,
      script((h) => (h < 48 ? 1.1 : 1.8), 1, 0.01),
      {
        each: (_, [hot]) => {
          if (hot!.state !== 'normal') return;
          const beyond = hot!.value! >= hot!.limit;
          told.add(beyond ? 'beyond' : 'within');
          if (beyond)
            expect(hot!.sentence).toMatch(/: at its limit or beyond, not decided yet \(\d/);
          expect(hot!.sentence.includes('as steep as')).toBe(
            hot!.value! < (hot!.healthy! + hot!.limit) / 2 && hot!.score! < 0.25,
          );
        },
      },
    );
    expect([...told].sort()).toEqual(['beyond', 'within']);
  });

  it('returns where it is as steep as before', () => {
    const { of } = watchScript(
      SPREAD,
      120,
      script((h) => (h < 48 || h > 70 ? 1 : 1.8)),
    );
    expect(of('hot').state).toBe('normal');
  });

  it('does not return because the twin was started anew with the degraded front', () => {
    const course = script((h) => (h < 48 ? 1 : h < 72 ? 1.8 : 1));
    const ended = (startLeft: boolean) =>
      watchScript(SPREAD, 120, (hour) => ({
        ...course(hour),
        ...(hour < 72 ? {} : { restarts: 1, startLeft }),
      })).of('hot').state;
    expect(ended(false)).toBe('degraded');
    expect(ended(true)).toBe('normal');
  });

  it('takes one value per pitch of the thermocouples, and none without a ratio', () => {
    let values = 0;
    let last: string | null = null;
    watchScript(
      SPREAD,
      40,
      script(() => 1),
      {
        each: (_, [hot]) => {
          if (hot!.time !== last) values++;
          last = hot!.time;
        },
      },
    );
    // 20 m by a pitch of 0.8 m, each begun by the next scan.
    expect(values).toBeGreaterThanOrEqual(22);
    expect(values).toBeLessThanOrEqual(25);
    const { views } = watchScript(SPREAD, 40, (hour) => ({
      ...script(() => 1)(hour),
      spread: { hot: null, cold: null },
    }));
    for (const view of views)
      expect(view).toMatchObject({ reason: 'not_exercised', healthy_from: 'twin' });
  });
});
