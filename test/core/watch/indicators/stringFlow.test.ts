import { describe, expect, it } from 'vitest';
import { STRING_FLOW } from '../../../../src/core/watch/indicators/stringFlow.js';
import { unsound, watchScript } from './filter.js';

const SUBJECTS = ['hot/a', 'hot/b', 'hot/c', 'cold/a', 'cold/b', 'cold/c'];
/** One of three equal strings gains a share, the others lose it. */
const channel = (string: string, share: number) => {
  const [store] = string.split('/');
  return Object.fromEntries(
    ['a', 'b', 'c'].map((name) => {
      const id = `${store}/${name}`;
      return [id, Math.log1p(id === string ? share : -share / 2)];
    }),
  );
};

describe('flow of the strings', () => {
  it('of a healthy bed is never uneven, with rings as unlike as they come', () => {
    for (const seed of [1, 2, 3]) {
      const { found, views } = watchScript(
        STRING_FLOW,
        8 * 24,
        () => ({ flow: channel('hot/a', 0.03) }),
        { seed, dt_s: 900 },
      );
      expect(found).toEqual({});
      expect(views.map(({ subject }) => subject)).toEqual(SUBJECTS);
      expect(new Set(views.map(({ state }) => state))).toEqual(new Set(['normal']));
    }
  });

  it('does not mind a meter, which moves all alike', () => {
    const all = Object.fromEntries(SUBJECTS.map((id) => [id, 0.3]));
    expect(watchScript(STRING_FLOW, 96, (h) => ({ flow: h < 48 ? {} : all })).found).toEqual({});
  });

  it('names the string that has gained, in its own sentence and those of the others', () => {
    for (const seed of [1, 2, 3]) {
      const { found, of, views } = watchScript(
        STRING_FLOW,
        72,
        (hour) => ({ flow: hour < 48 ? {} : channel('cold/b', 0.22) }),
        { seed },
      );
      expect(Object.keys(found).sort()).toEqual(['cold/a', 'cold/b', 'cold/c']);
      expect(found['cold/b']).toBeLessThan(54);
      expect(of('cold/b').sentence).toMatch(/gets \+\d.*found an easier way there/);
      expect(of('cold/b').limit).toBeGreaterThan(1);
      expect(of('cold/a').sentence).toMatch(/gets -\d.*gone to string b/);
      expect(of('cold/a').limit).toBeLessThan(1);
      expect(views.flatMap(unsound)).toEqual([]);
    }
  });

  it('finds what was gross from the start', () => {
    const { found } = watchScript(STRING_FLOW, 12, () => ({ flow: channel('hot/c', 0.22) }));
    expect(found['hot/c']).toBeLessThan(8);
  });

  it('returns where it is even again', () => {
    const { found, of } = watchScript(STRING_FLOW, 120, (hour) => ({
      flow: hour < 48 || hour > 72 ? {} : channel('hot/a', 0.2),
    }));
    expect(found['hot/a']).toBeLessThan(72);
    expect(of('hot/a').state).toBe('normal');
  });

  it('says of a single string that nothing can be told', () => {
    const { views } = watchScript(STRING_FLOW, 12, () => ({}), { strings: ['a'] });
    for (const view of views) {
      expect(view).toMatchObject({
        ...{ state: 'undetermined', reason: 'not_instrumented', value: null, healthy: null },
        ...{ healthy_from: null, score: null },
      });
      expect(unsound(view)).toEqual([]);
    }
  });
});
