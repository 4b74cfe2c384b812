import { describe, expect, it } from 'vitest';
import { SCENARIOS } from '../../tools/score/scenarios.js';
import { tally } from '../../tools/score/tally.js';
import { healthyDays, wrongNames } from '../../tools/score/wrongNames.js';
import { syntheticSeries } from './syntheticSeries.js';

const point = () => ({
  soc: 0.5,
  found_soc: 0.5,
  soc_sigma: 0.01,
  position_m: 4,
  found_position_m: 4,
});
const rejections = [{ store: 'hot', sensor: 'hot_axis_03', verdict: 'stuck', from: 59, to: 119 }];
const nominal = SCENARIOS.find((s) => s.id === 'nominal')!;
const random = SCENARIOS.find((s) => s.id === 'nominal-random')!;
const run = (scenario: typeof nominal, place: number, seed: number, hours: number) => ({
  scenario,
  row: scenario.rows[place]!,
  // The first hour is not scored.
  result: tally(syntheticSeries(60 * (hours + 1), point, { rejections }), seed),
});

describe('healthy unit-days', () => {
  it('count a recording once, however many sensor sets read it', () => {
    const runs = [
      run(nominal, 0, 1, 24),
      run(nominal, 1, 1, 24),
      run(nominal, 2, 1, 12),
      run(nominal, 0, 2, 24),
      run(random, 0, 1, 12),
    ];
    const { days, read } = healthyDays(runs);
    expect(days).toBeCloseTo(1 + 1 + 0.5, 12);
    expect(read).toBeCloseTo(4, 12);
  });
});

describe('sensors wrongly named', () => {
  it('are listed by sensor, verdict and seed, with when and where', () => {
    expect(wrongNames([run(random, 1, 1007, 3)])).toMatchObject([
      {
        name: '  hot_axis_03 stuck, seed 1007',
        value: 1,
        unit: 'h',
        note: '1.0 to 2.0 h, nominal-random five-class',
        met: null,
      },
    ]);
  });

  it('beyond the first forty are counted', () => {
    const figures = wrongNames(Array.from({ length: 43 }, (_, i) => run(nominal, 0, i, 3)));
    expect(figures).toHaveLength(41);
    expect(figures.at(-1)).toMatchObject({ name: '  and others', value: 3 });
  });
});
