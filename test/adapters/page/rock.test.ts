import { describe, expect, it } from 'vitest';
import { gapsOf, nearest, neighbour } from '../../../src/adapters/page/maintenance/moments.js';
import {
  alongOf,
  byStanding,
  digitsOf,
  sinceOf,
  standingOf,
  valueWords,
} from '../../../src/adapters/page/maintenance/standing.js';
import {
  courseColumns,
  indicatorColumns,
  runColumns,
  stringColumns,
} from '../../../src/adapters/page/maintenance/weekColumns.js';
import type {
  Indicator,
  IndicatorCourse,
  Run,
} from '../../../src/adapters/page/maintenance/wire.js';

const indicator = (parts: Partial<Indicator>): Indicator => ({
  ...{ kind: 'heat_transfer', subject: 'hot', value: 0.9, sigma: 0.02, unit: '-' },
  ...{ healthy: 0.93, healthy_from: 'learned', limit: 0.65, deadband: 0.05 },
  ...{ on_delay_s: 0, off_delay_s: 0, score: 0, state: 'normal', reason: null },
  ...{ time: null, sentence: '' },
  ...parts,
});

const at = (minutes: number) => new Date(Date.UTC(2026, 0, 31, 6, minutes)).toISOString();
const times = [0, 10, 20, 30, 40].map(at);
const course = (parts: Partial<IndicatorCourse>): IndicatorCourse => ({
  ...{ kind: 'heat_transfer', subject: 'hot', unit: '-' },
  ...{ value: [1, 2, 3, 4, 5], sigma: [0.1, 0.1, null, 0.1, 0.1], healthy: [1, 1, 1, 1, 1] },
  ...{ limit: [2, 2, 2, 2, 2], deadband: [0, 0, 0, 0, 0], score: [0, 0, 0.5, 1, 1] },
  state: ['normal', 'normal', 'normal', 'degraded', 'degraded'],
  ...parts,
});

describe('standing of an indicator', () => {
  it('calls healthy only what is on the healthy side, and open what is at its limit', () => {
    expect(standingOf(indicator({}))).toBe('healthy');
    expect(standingOf(indicator({ value: 0.7, score: 0.6 }))).toBe('open');
    expect(standingOf(indicator({ state: 'degraded' }))).toBe('changed');
    const learning = { state: 'undetermined', reason: 'learning' } as const;
    expect(standingOf(indicator(learning))).toBe('unknown');
    expect(standingOf(indicator({ ...learning, value: 0.6 }))).toBe('open');
    expect(standingOf(indicator({ ...learning, value: null }))).toBe('unknown');
  });

  it('puts what has changed first and keeps the order of the server within', () => {
    const all = [
      indicator({ subject: 'a' }),
      indicator({ subject: 'b', state: 'undetermined', value: null }),
      indicator({ subject: 'c', state: 'degraded' }),
      indicator({ subject: 'd' }),
    ];
    expect(byStanding(all).map(({ subject }) => subject)).toEqual(['c', 'a', 'd', 'b']);
  });

  it('measures from healthy to limit whichever way that is', () => {
    expect(alongOf({ healthy: 0.93, limit: 0.65 }, 0.79)).toBeCloseTo(0.5, 12);
    expect(alongOf({ healthy: 1, limit: 1.5 }, 1.5)).toBe(1);
    expect(alongOf({ healthy: null, limit: 1.5 }, 1)).toBeNull();
  });

  it('says as many digits as tell healthy and limit apart, and no sigma of none', () => {
    expect(digitsOf({ healthy: 0.93, limit: 0.65 })).toBe(2);
    expect(digitsOf({ healthy: 0, limit: 0.0025 })).toBe(4);
    expect(digitsOf({ healthy: 0, limit: 8 })).toBe(1);
    expect(valueWords(indicator({}))).toBe('0.90 ± 0.02');
    expect(valueWords(indicator({ sigma: 0 }))).toBe('0.90');
    expect(valueWords(indicator({ value: null }))).toBe('–');
    expect(valueWords(indicator({ unit: 'K', healthy: 0, limit: 8, value: -1.26 }))).toBe(
      '−1.3 ± 0.1 K',
    );
  });

  it('takes the last zero of the test for the begin, and the first degraded for the decision', () => {
    expect(sinceOf(times, course({}))).toEqual({ began: at(10), decided: at(30) });
    expect(sinceOf(times, course({ score: [0.1, 0.3, 0.5, 1, 1] }))).toEqual({
      began: null,
      decided: at(30),
    });
    const state = Array<'degraded'>(5).fill('degraded');
    expect(sinceOf(times, course({ state }))).toEqual({ began: null, decided: null });
    expect(
      sinceOf(times, course({ state: ['degraded', 'normal', null, null, 'normal'] })),
    ).toBeNull();
  });
});

describe('columns over weeks', () => {
  const seconds = (minutes: number) => Date.parse(at(minutes)) / 1000;

  it('breaks a line where nothing was stored for more than two spacings', () => {
    const history = { times: [0, 10, 40, 60].map(at), every_s: 600 };
    expect(courseColumns(history, [[1, 2, 3, null]])).toEqual([
      [0, 10, 25, 40, 60].map(seconds),
      [1, 2, null, 3, null],
    ]);
  });

  it('has two sigmas about the value, and no band where sigma is unknown', () => {
    const [, , above, below] = indicatorColumns({ times, every_s: 600 }, course({}));
    expect(above).toEqual([1.2, 2.2, null, 4.2, 5.2]);
    expect(below).toEqual([0.8, 1.8, null, 3.8, 4.8]);
  });

  it('sets each string over its own healthy value, with a limit on either side', () => {
    const one = course({
      value: [2, 2, 2, null, 2],
      healthy: [2, 2, 2, 2, 2],
      limit: [2.2, 2.2, 2.2, 2.2, 2.2],
    });
    const [, value, healthy, above, below] = stringColumns({ times, every_s: 600 }, [one]);
    expect(value).toEqual([1, 1, 1, null, 1]);
    expect(healthy).toEqual([1, 1, 1, 1, 1]);
    expect(above![0]).toBeCloseTo(1.1, 12);
    expect(below![0]).toBeCloseTo(0.9, 12);
  });

  it('joins runs of a kind over those of the other, not over time that was not recorded', () => {
    const run = (kind: Run['kind'], from: number, to: number) =>
      ({ kind, from: at(from), to: at(to), no: to }) as Run;
    const runs = [
      run('charge', 0, 60),
      run('stand', 60, 90),
      run('discharge', 90, 120),
      run('charge', 300, 360),
    ];
    const [x, charge, discharge] = runColumns(runs, ['charge', 'discharge'], ({ no }) => no);
    expect(x).toEqual([60, 120, 210, 360].map(seconds));
    expect(charge).toEqual([60, undefined, null, 360]);
    expect(discharge).toEqual([undefined, 120, null, undefined]);
  });
});

describe('moments of the past', () => {
  const moments = [0, 10, 20, 60, 70].map((minutes) => ({ time: at(minutes) }));
  const s = (minutes: number) => Date.parse(at(minutes)) / 1000;

  it('finds the nearest within a spacing, nothing within a gap', () => {
    expect(nearest(moments, s(13), 600)?.time).toBe(at(10));
    expect(nearest(moments, s(40), 600)).toBeNull();
    expect(gapsOf(moments, 600)).toEqual([[s(20), s(60)]]);
  });

  it('steps to the stored neighbours, over a gap too, and not beyond the ends', () => {
    expect(neighbour(moments, s(20), 1)?.time).toBe(at(60));
    expect(neighbour(moments, s(40), -1)?.time).toBe(at(20));
    expect(neighbour(moments, s(0), -1)).toBeNull();
    expect(neighbour(moments, s(70), 1)).toBeNull();
  });
});
