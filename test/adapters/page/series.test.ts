import { describe, expect, it } from 'vitest';
import { chartColumns, hoursColumns } from '../../../src/adapters/page/lib/series.js';

const row = (minute: number, a: number | null, b: number | null = null) => ({
  time: new Date(minute * 60_000).toISOString(),
  a,
  b,
});

describe('the columns of a chart', () => {
  it('join points that are usually that far apart, and break the line where one is missing', () => {
    const b = (minute: number) =>
      minute % 10 === 0 && minute !== 30 && minute !== 40 ? minute : null;
    const rows = Array.from({ length: 61 }, (_, minute) => row(minute, minute, b(minute)));
    const [, , values] = chartColumns({ rows }, ['a', 'b'], 1);
    // 0, 10, 20 are joined; between 20 and 50 are 30 min, three times the usual: broken.
    expect(values!.slice(0, 12)).toEqual([0, ...Array(9).fill(undefined), 10, undefined]);
    expect(values!.slice(20, 51)).toEqual([20, ...Array(29).fill(null), 50]);
    expect(values!.slice(50, 61)).toEqual([50, ...Array(9).fill(undefined), 60]);
  });

  it('break the line where nothing was stored, as while the daemon was down', () => {
    const rows = [0, 1, 2, 3, 60, 61].map((minute) => row(minute, minute));
    const [seconds, values] = chartColumns({ rows }, ['a'], 100);
    expect(seconds).toEqual([0, 60, 120, 180, 31.5 * 60, 3600, 3660]);
    expect(values).toEqual([0, 100, 200, 300, null, 6000, 6100]);
  });

  it('hold for an empty history and a single row', () => {
    expect(chartColumns({ rows: [] }, ['a'], 1)).toEqual([[], []]);
    expect(chartColumns({ rows: [row(5, 7)] }, ['a'], 1)).toEqual([[300], [7]]);
  });
});

describe('the stored hours that are shown', () => {
  it('are those at the configured power nearest to the rated one', () => {
    expect(hoursColumns({ hours_at_MW_el: [0.5, 1.85, 3], rated_power_MW_el: 2 })).toEqual({
      power_MW: 1.85,
      columns: ['hours_p90_at_1.85_MW', 'hours_p50_at_1.85_MW', 'hours_p10_at_1.85_MW'],
    });
    expect(hoursColumns({ hours_at_MW_el: [], rated_power_MW_el: 2 })).toBeNull();
  });
});
