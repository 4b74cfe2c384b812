import type uPlot from 'uplot';
import { fixed } from '../lib/format.js';
import { timeRange } from '../parts/chartOptions.js';
import { inkOf } from '../parts/dark.js';

/** How a line looks, and what stands at its end; lines are told apart without colour. */
export interface Line {
  /** '' for what bounds a band. */
  readonly label: string;
  readonly dash?: readonly number[];
  readonly soft?: boolean;
  readonly points?: 'filled' | 'hollow';
}

const HEIGHT = 160;
const LABELS_PX = 76;
const LEAST_APART_PX = 13;

/** Options of a chart over days and weeks; `tell` hears where the cursor is, null at rest. */
export function weekOptions(
  lines: readonly Line[],
  band: readonly [number, number] | null,
  width: number,
  tell: (index: number | null) => void,
): uPlot.Options {
  const [soft, ink, paper, rule] = ['--soft', '--ink', '--paper', '--rule'].map(inkOf) as [
    string,
    string,
    string,
    string,
  ];
  const axis = { stroke: soft, font: '12px system-ui, sans-serif' };
  const grid = { stroke: rule, width: 1 };
  return {
    width,
    height: HEIGHT,
    padding: [8, LABELS_PX, 0, 0],
    legend: { show: false },
    cursor: { sync: { key: 'rock-weeks' }, drag: { x: false, y: false }, points: { size: 7 } },
    scales: { x: { range: timeRange } },
    axes: [
      { ...axis, grid, ticks: grid, values: dayTicks, space: 62, size: 30 },
      { ...axis, grid, ticks: grid, size: 46, space: 24, values: evenTicks },
    ],
    series: [
      {},
      ...lines.map(({ label, dash, soft: isSoft, points }): uPlot.Series => {
        const stroke = isSoft ? soft : ink;
        return {
          label,
          ...(label === '' ? { stroke: 'transparent', width: 0, auto: false } : { stroke }),
          ...(label === '' ? {} : { width: isSoft ? 1.2 : 1.8 }),
          ...(dash === undefined ? {} : { dash: [...dash] }),
          points:
            points === undefined
              ? { show: false }
              : {
                  show: true,
                  size: 7,
                  stroke,
                  width: 1.4,
                  fill: points === 'filled' ? ink : paper,
                },
        };
      }),
    ],
    ...(band === null
      ? {}
      : { bands: [{ series: [...band] as [number, number], fill: inkOf('--band') }] }),
    hooks: {
      setCursor: [(chart) => tell(chart.cursor.idx ?? null)],
      draw: [(chart) => labelLines(chart, lines, ink)],
    },
  };
}

/** The last value that is known. */
function lastOf(values: ArrayLike<number | null | undefined> | undefined): number | null {
  for (let i = (values?.length ?? 0) - 1; i >= 0; i--) {
    const value = values?.[i];
    if (value !== null && value !== undefined) return value;
  }
  return null;
}

/** Writes each line's name beside its last point, pushed apart where they would meet. */
function labelLines(chart: uPlot, lines: readonly Line[], ink: string): void {
  const ratio = devicePixelRatio;
  const { left, width, top, height } = chart.bbox;
  const places = lines.flatMap(({ label }, k) => {
    const last = lastOf(chart.data[k + 1]);
    if (label === '' || last === null) return [];
    const y = chart.valToPos(last, 'y', true);
    return [{ label, y: Math.min(top + height, Math.max(top, y)) }];
  });
  places.sort((a, b) => a.y - b.y);
  for (const [i, place] of places.entries()) {
    const above = places[i - 1];
    if (above !== undefined) place.y = Math.max(place.y, above.y + LEAST_APART_PX * ratio);
  }
  const { ctx } = chart;
  ctx.save();
  ctx.font = `${12 * ratio}px system-ui, sans-serif`;
  ctx.fillStyle = ink;
  ctx.textAlign = 'left';
  ctx.textBaseline = 'middle';
  for (const { label, y } of places) ctx.fillText(label, left + width + 6 * ratio, y);
  ctx.restore();
}

const two = (value: number) => String(value).padStart(2, '0');

/** Figures of an axis with equally many decimals, as many as the finest of them needs. */
export function evenTicks(_chart: unknown, values: readonly number[]): string[] {
  const texts = values.map((value) => String(Number(value.toPrecision(10))));
  const digits = Math.max(0, ...texts.map((text) => text.split('.')[1]?.length ?? 0));
  return values.map((value) => fixed(value, digits));
}

/** Days as dates, hours within them on the 24-hour clock. */
function dayTicks(_chart: uPlot, seconds: number[]): string[] {
  return seconds.map((second) => {
    const at = new Date(second * 1000);
    const midnight = at.getHours() === 0 && at.getMinutes() === 0;
    return midnight
      ? `${two(at.getMonth() + 1)}-${two(at.getDate())}`
      : `${two(at.getHours())}:${two(at.getMinutes())}`;
  });
}
