import type uPlot from 'uplot';

export type ChartKind = 'charge' | 'hours';

const HEIGHT = 132;
const LEAST_S = 3_600;

/**
 * Ends of a time axis [s]: a moment alone stands amid its hour. Left to itself uPlot gives one a day, of
 * milliseconds: years of seconds.
 */
export function timeRange(
  { data }: Pick<uPlot, 'data'>,
  from: number | null,
  to: number | null,
): uPlot.Range.MinMax {
  if (from === null || to === null) return [null, null];
  const last = data[0].length === 1 ? from : to;
  return last - from < LEAST_S ? [last - LEAST_S / 2, last + LEAST_S / 2] : [from, to];
}

function ink(name: string): string {
  return getComputedStyle(document.documentElement).getPropertyValue(name).trim();
}

/** How a chart looks; its inks are those of the style sheet at the time it is made. */
export function chartOptions(
  kind: ChartKind,
  width: number,
  tell: (chart: uPlot) => void,
): uPlot.Options {
  const soft = ink('--soft');
  const line = ink('--ink');
  const axis = { stroke: soft, font: '12px system-ui, sans-serif' };
  const grid = { stroke: ink('--rule'), width: 1 };
  const points = { show: false };
  const thin = { stroke: soft, width: 1, points };
  return {
    width,
    height: HEIGHT,
    legend: { show: false },
    cursor: { sync: { key: 'history' }, drag: { x: false, y: false }, points: { size: 7 } },
    scales: {
      x: { range: timeRange },
      y: {
        range: kind === 'charge' ? [0, 100] : (_u, _min, max) => [0, Math.max(1, max * 1.08)],
      },
    },
    axes: [
      { ...axis, grid, ticks: grid, values: timeTicks },
      { ...axis, grid, ticks: grid, size: 40, space: 20 },
    ],
    series:
      kind === 'charge'
        ? [{}, { stroke: line, width: 2, points }]
        : [{}, thin, { stroke: line, width: 2, dash: [6, 3], points }, thin],
    ...(kind === 'hours'
      ? { bands: [{ series: [3, 1] as [number, number], fill: ink('--band') }] }
      : {}),
    hooks: { setCursor: [tell] },
  };
}

/** 24-hour clock; the date where a day begins. */
function timeTicks(_chart: uPlot, seconds: number[]): string[] {
  return seconds.map((second) => {
    const at = new Date(second * 1000);
    const two = (value: number) => String(value).padStart(2, '0');
    if (at.getHours() === 0 && at.getMinutes() === 0) {
      return `${two(at.getMonth() + 1)}-${two(at.getDate())}`;
    }
    return `${two(at.getHours())}:${two(at.getMinutes())}`;
  });
}
