import { describe, expect, it } from 'vitest';
import { timeRange } from '../../../src/adapters/page/parts/chartOptions.js';

const T = 1_790_000_000;
const chart = (...times: number[]) => ({ data: [times] as [number[]] });

describe('the ends of a time axis', () => {
  it('are an hour about a moment alone, whatever uPlot has made of it', () => {
    // What uPlot 1.6 hands over for one point in seconds.
    expect(timeRange(chart(T), T, T + 86_400_000)).toEqual([T - 1800, T + 1800]);
    expect(timeRange(chart(T), T, T)).toEqual([T - 1800, T + 1800]);
  });

  it('are those of the data where there is more', () => {
    expect(timeRange(chart(T, T + 7200), T, T + 7200)).toEqual([T, T + 7200]);
    expect(timeRange(chart(T, T + 60), T, T + 60)).toEqual([T + 60 - 1800, T + 60 + 1800]);
    expect(timeRange(chart(), null, null)).toEqual([null, null]);
  });
});
