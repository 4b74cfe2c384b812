import { describe, expect, it } from 'vitest';
import { figure } from '../../tools/score/figure.js';
import { commonFigures, pooled } from '../../tools/score/figures.js';
import { SCENARIOS } from '../../tools/score/scenarios.js';
import { addError, emptySum, mergeSum, rmsOf, tally, worstOf } from '../../tools/score/tally.js';
import { syntheticSeries } from './syntheticSeries.js';

/** Wrong by 3 % in the first hour, then by -0.2 % and +0.4 % in turn, with a sigma of 0.2 %. */
const point = (n: number) => ({
  soc: 0.5,
  found_soc: 0.5 + (n < 60 ? 0.03 : n % 2 === 0 ? -0.002 : 0.004),
  soc_sigma: 0.002,
  position_m: 4,
  found_position_m: n < 180 ? 4.01 : null,
});
const hours = [
  { scan: 30, truth_h: 5, p90: 9, p50: 9, p10: 9 },
  { scan: 100, truth_h: 4, p90: 3.5, p50: 3.9, p10: 4.3 },
  { scan: 160, truth_h: 2, p90: 2.1, p50: 2.4, p10: 2.7 },
  { scan: 200, truth_h: 0, p90: 0, p50: 0, p10: 0.1 },
].map((h) => ({ ...h, power_W: 1e6, line_h: h.truth_h + 2 }));
const rejections = [{ store: 'hot', sensor: 'hot_axis_03', verdict: 'offset', from: 90, to: 130 }];
const result = tally(syntheticSeries(240, point, { hours, rejections }), 7, { extra: 1 });
// Errors pass through single floats; soc 0.5 is exact.
const RMS = Math.sqrt((0.2 ** 2 + 0.4 ** 2) / 2);

describe('the tally of one run', () => {
  it('counts from one hour after the start, both stores together and apart', () => {
    // The scan with index 59 is that of the full hour, which still belongs to the start.
    expect(result.scored_h).toBe(3);
    expect(result.sums.soc!.n).toBe(2 * 180);
    expect(result.sums['soc hot']!.n).toBe(180);
    expect(rmsOf(result.sums.soc)).toBeCloseTo(RMS, 9);
    expect(result.sums.soc!.worst).toBeCloseTo(0.4, 9);
    expect(result.sums.soc!.at).toMatch(/^seed 7 (hot|cold) \d+\.\d\d h$/);
  });

  it('divides each error by its own sigma', () => {
    expect(rmsOf(result.sums['soc/sigma'])).toBeCloseTo(RMS / 0.2, 9);
    // Stored heat is off by 30 times as much, with 30 times the sigma and a factor of two.
    expect(rmsOf(result.sums['stored/sigma'])).toBeCloseTo(RMS / 0.4, 5);
  });

  it('compares fronts where there are as many as in truth, and counts where not', () => {
    expect(rmsOf(result.sums.position)).toBeCloseTo(0.01, 6);
    expect(rmsOf(result.sums.width)).toBeCloseTo(0.02, 6);
    expect(result.fronts).toEqual({ unmatched: 2 * 60, all: 2 * 180 });
  });

  it('keeps the answers of hours, and leaves zero-hour cases out of the sums', () => {
    expect(result.hours).toHaveLength(3);
    expect(result.sums.hours!.n).toBe(2);
    expect(rmsOf(result.sums.hours)).toBeCloseTo(Math.sqrt((0.1 ** 2 + 0.4 ** 2) / 2), 9);
    // Sigma from p90 to p10: 1.2816 sigma either way.
    const sigmas = [0.1 / (0.4 / 1.2815515655), 0.4 / (0.3 / 1.2815515655)];
    expect(rmsOf(result.sums['hours/sigma'])).toBeCloseTo(
      Math.sqrt((sigmas[0]! ** 2 + sigmas[1]! ** 2) / 2),
      6,
    );
  });

  it('keeps who was rejected, when, and the figures of the scenario', () => {
    expect(result.rejections).toEqual([
      { sensor: 'hot_axis_03', verdict: 'offset', from_h: 91 / 60, to_h: 131 / 60 },
    ]);
    expect(result.own).toEqual({ extra: 1 });
  });
});

describe('an error that is no finite number', () => {
  it('is counted, and leaves no rms that could meet a goal', () => {
    const at = () => 'seed 1';
    const sum = emptySum();
    addError(sum, 0.5, at);
    expect([rmsOf(sum), worstOf(sum)]).toEqual([0.5, 0.5]);
    addError(sum, Number.NaN, at);
    expect(sum).toMatchObject({ n: 1, broken: 1 });
    const other = emptySum();
    addError(other, -0.1, at);
    mergeSum(other, sum);
    for (const value of [rmsOf(other), worstOf(other)]) {
      expect(figure('error', value, '', { most: 1 }).met).toBe(false);
    }
    expect(rmsOf(emptySum())).toBeNull();
  });
});

describe('cases in which no hours were left', () => {
  const scenario = SCENARIOS.find((s) => s.id === 'nominal')!;
  const row = scenario.rows.find((r) => r.id === 'all-independent')!;
  const asked = (p90: number) =>
    [
      { scan: 100, truth_h: 4, p90: 3.5, p50: 3.9, p10: 4.3 },
      { scan: 160, truth_h: 0, p90, p50: 0.2, p10: 0.5 },
    ].map((h) => ({ ...h, power_W: 1e6, line_h: h.truth_h + 2 }));
  const value = (p90: number, name: string) => {
    const run = tally(syntheticSeries(240, point, { hours: asked(p90) }), 7);
    const figures = commonFigures(scenario, row, [run], { rated_h: 6, fresh: [] });
    return figures.find((f) => f.name.trim() === name)!.value;
  };

  it('are no hits, and misses where hours were firm', () => {
    expect(value(0, 'truth below p90')).toBe(0);
    expect(value(0, 'truth inside p90..p10')).toBe(100);
    expect(value(0.1, 'truth below p90')).toBe(50);
    expect(value(0.1, 'truth inside p90..p10')).toBe(50);
    expect(value(0, 'p90 above zero where truth is zero')).toBe(0);
    expect(value(0.1, 'p90 above zero where truth is zero')).toBe(1);
  });
});

describe('the figures of a row', () => {
  const scenario = SCENARIOS.find((s) => s.id === 'nominal')!;
  const row = scenario.rows.find((r) => r.id === 'all-independent')!;
  const perfect = tally(
    syntheticSeries(240, (n) => ({ ...point(n), found_soc: 0.5 })),
    8,
  );
  const figures = commonFigures(scenario, row, [result, perfect], { rated_h: 6, fresh: [8] });
  const named = (name: string) => figures.find((f) => f.name.trim() === name)!;

  it('pool the runs', () => {
    expect(pooled([result, perfect]).soc!.n).toBe(4 * 180);
    expect(named('state of charge, rms').value).toBeCloseTo(RMS / Math.SQRT2, 9);
    expect(named('sensors wrongly named').value).toBe(1);
    expect(named('state of charge, rms').note).toBe('fresh seeds alone 0.000');
  });

  it('are marked against the goals', () => {
    expect(named('state of charge, rms')).toMatchObject({ target: '<= 0.1', met: false });
    expect(named('state of charge, worst')).toMatchObject({ target: '<= 0.3', met: false });
    expect(named('front position, rms')).toMatchObject({ target: '<= 0.03', met: true });
    expect(named('straight lines, rms')).toMatchObject({ target: null, met: null });
  });

  it('count truths below p90 and inside p90..p10 among cases that are not zero hours', () => {
    // Of two answers one truth lies inside, the other below p90.
    expect(named('truth below p90').value).toBeCloseTo(50, 12);
    expect(named('truth inside p90..p10').value).toBeCloseTo(50, 12);
    expect(named('truth below p90').note).toContain('2 cases');
  });

  it('hold the pinball loss against straight lines with their best constant', () => {
    // Lines are wrong by 2 h always: with that taken off nothing is left to beat.
    expect(named('pinball loss of p50')).toMatchObject({ target: '<= 0', met: false });
  });

  it('have none of the goals with three thermocouples', () => {
    const three = scenario.rows.find((r) => r.id === 'three-independent')!;
    const marked = commonFigures(scenario, three, [result], { rated_h: 6, fresh: [8] }).filter(
      (f) => f.met !== null,
    );
    expect(marked.map((f) => f.name)).toEqual(['sensors wrongly named']);
  });
});

describe('a figure', () => {
  it('that could not be had misses its goal', () => {
    expect(figure('x', null, '', { most: 1 }).met).toBe(false);
    expect(figure('x', Number.NaN, '', { most: 1 }).met).toBe(false);
    expect(figure('x', null, '').met).toBeNull();
  });

  it('keeps both ends of its goal', () => {
    const goal = { least: 0.8, most: 1.25 };
    const marks = [0.79, 0.8, 1, 1.25, 1.26].map((value) => figure('x', value, '', goal).met);
    expect(marks).toEqual([false, true, true, true, false]);
  });
});
