import { type ScaleLinear, type ScaleTime, scaleLinear, scaleUtc } from 'd3-scale';
import { line } from 'd3-shape';
import { escapeText } from './escape.js';

/** How a series is drawn; told apart by form, never by colour alone, so that it survives a copier. */
export const LOOKS = ['solid', 'dashed', 'dotted', 'dash-dot'] as const;
export type Look = (typeof LOOKS)[number];

export interface PlotPoint {
  /** Time [ms], or place [m]. */
  readonly x: number;
  /** null breaks the line. */
  readonly y: number | null;
  /** Half the length of the bar [as y]. */
  readonly sigma?: number | null;
}

export interface PlotSeries {
  readonly label: string;
  readonly look: Look;
  readonly points: readonly PlotPoint[];
  /** Points as marks (with bars where they have a sigma) joined by a thin line, or a plain line. */
  readonly marks?: boolean;
  /** Marks alone, hollow ones for what is not believed. */
  readonly hollow?: boolean;
  readonly unjoined?: boolean;
}

export interface PlotOptions {
  /** What it shows, for those who cannot see it. */
  readonly title: string;
  readonly y_label: string;
  readonly x:
    | { readonly kind: 'time'; readonly from: number; readonly to: number }
    | {
        readonly kind: 'place';
        readonly from: number;
        readonly to: number;
        readonly label: string;
      };
  readonly series: readonly PlotSeries[];
  /** Values that the axis has to hold anyway. */
  readonly hold?: readonly number[];
  /** A line that is not to be crossed, with its word. */
  readonly limit?: { readonly value: number; readonly word: string };
  readonly height?: number;
}

const WIDTH = 700;
const EDGE = { top: 24, right: 92, bottom: 28, left: 56 };
const DASHES: Readonly<Record<Look, string>> = {
  solid: '',
  dashed: '7 3',
  dotted: '2 2.5',
  'dash-dot': '8 3 2 3',
};

type X = ScaleTime<number, number> | ScaleLinear<number, number>;

/** A plot as inline SVG that needs nothing from outside; a sentence in its place where nothing is known. */
export function plot(options: PlotOptions): string {
  const values = options.series.flatMap(({ points }) =>
    points.flatMap(({ y, sigma }) => (y === null ? [] : [y - (sigma ?? 0), y + (sigma ?? 0)])),
  );
  if (values.length === 0)
    return `<p class="empty">${escapeText(options.title)}: nothing was recorded in this span.</p>`;
  const height = options.height ?? 170;
  const held = [
    ...values,
    ...(options.hold ?? []),
    ...(options.limit ? [options.limit.value] : []),
  ];
  const y = scaleLinear()
    .domain(padded(Math.min(...bounds(held)), Math.max(...bounds(held))))
    .nice(4)
    .range([height - EDGE.bottom, EDGE.top]);
  const right = WIDTH - EDGE.right;
  const x: X =
    options.x.kind === 'time'
      ? scaleUtc().domain([options.x.from, options.x.to]).range([EDGE.left, right])
      : scaleLinear().domain([options.x.from, options.x.to]).range([EDGE.left, right]);
  return [
    `<svg viewBox="0 0 ${WIDTH} ${height}" role="img" aria-label="${escapeText(options.title)}">`,
    axes(options, x, y, height),
    limitLine(options, y),
    ...options.series.map((series) => drawn(series, x, y)),
    labels(options.series, y),
    '</svg>',
  ].join('');
}

/** Least and greatest, without spreading a long list over arguments. */
function bounds(values: readonly number[]): [number, number] {
  return values.reduce<[number, number]>(
    ([low, high], value) => [Math.min(low, value), Math.max(high, value)],
    [Number.POSITIVE_INFINITY, Number.NEGATIVE_INFINITY],
  );
}

/** A constant needs an axis, too. */
function padded(low: number, high: number): [number, number] {
  if (high > low) return [low, high];
  const half = Math.abs(low) * 0.05 || 1;
  return [low - half, high + half];
}

function axes(options: PlotOptions, x: X, y: ScaleLinear<number, number>, height: number): string {
  const right = WIDTH - EDGE.right;
  const base = height - EDGE.bottom;
  const format = y.tickFormat(4);
  const rows = y.ticks(4).map((tick) => {
    const at = round(y(tick));
    return (
      `<line class="grid" x1="${EDGE.left}" x2="${right}" y1="${at}" y2="${at}"/>` +
      `<text class="tick" x="${EDGE.left - 6}" y="${at}" dy="0.32em" text-anchor="end">${format(tick)}</text>`
    );
  });
  const ticks: [number, string][] =
    options.x.kind === 'time'
      ? timeTicks(x as ScaleTime<number, number>)
      : (x as ScaleLinear<number, number>).ticks(8).map((tick) => [tick, String(tick)]);
  const columns = ticks.map(([tick, word]) => {
    const at = round(Number(x(tick)));
    return (
      `<line class="axis" x1="${at}" x2="${at}" y1="${base}" y2="${base + 4}"/>` +
      `<text class="tick" x="${at}" y="${base + 15}" text-anchor="middle">${word}</text>`
    );
  });
  const x_label =
    options.x.kind === 'place'
      ? `<text class="tick" x="${right + 8}" y="${base + 15}">${escapeText(options.x.label)}</text>`
      : '';
  return (
    `${rows.join('')}<line class="axis" x1="${EDGE.left}" x2="${right}" y1="${base}" y2="${base}"/>` +
    `${columns.join('')}${x_label}` +
    `<text class="tick" x="4" y="9">${escapeText(options.y_label)}</text>`
  );
}

/** Month and day, or the hour for a tick within a day; UTC as all times of a report. */
function timeTicks(x: ScaleTime<number, number>): [number, string][] {
  return x.ticks(7).map((tick) => {
    const text = tick.toISOString();
    return [Number(tick), Number(tick) % 86_400_000 === 0 ? text.slice(5, 10) : text.slice(11, 16)];
  });
}

function limitLine({ limit }: PlotOptions, y: ScaleLinear<number, number>): string {
  if (limit === undefined) return '';
  const at = round(y(limit.value));
  const right = WIDTH - EDGE.right;
  return (
    `<line class="limit" x1="${EDGE.left}" x2="${right}" y1="${at}" y2="${at}"/>` +
    `<text class="tick" x="${EDGE.left + 4}" y="${at - 4}">${escapeText(limit.word)}</text>`
  );
}

function drawn(series: PlotSeries, x: X, y: ScaleLinear<number, number>): string {
  const at = (point: PlotPoint): [number, number] => [
    round(Number(x(point.x))),
    round(y(point.y ?? 0)),
  ];
  const path = line<PlotPoint>()
    .defined((point) => point.y !== null)
    .x((point) => at(point)[0])
    .y((point) => at(point)[1]);
  const isMarked = series.marks === true || series.unjoined === true;
  const curve =
    series.unjoined === true
      ? ''
      : `<path class="${isMarked ? 'thin' : 'line'}" d="${path(series.points) ?? ''}" stroke-dasharray="${DASHES[series.look]}"/>`;
  if (!isMarked) return curve;
  const dots = series.points.map((point) => {
    if (point.y === null) return '';
    const [cx, cy] = at(point);
    const sigma = point.sigma ?? 0;
    const bar =
      sigma > 0
        ? `<line class="bar" x1="${cx}" x2="${cx}" y1="${round(y(point.y - sigma))}" y2="${round(y(point.y + sigma))}"/>`
        : '';
    return bar + mark(series, cx, cy);
  });
  return curve + dots.join('');
}

function mark({ look, hollow }: PlotSeries, x: number, y: number): string {
  const kind = hollow === true ? 'hollow' : 'mark';
  if (look === 'dashed') return `<path class="${kind}" d="M${x - 3} ${y - 3}h6v6h-6z"/>`;
  if (look === 'dotted') return `<path class="${kind}" d="M${x} ${y - 3.6}l3.4 6h-6.8z"/>`;
  if (look === 'dash-dot') return `<path class="${kind}" d="M${x} ${y - 4}l4 4-4 4-4-4z"/>`;
  return `<circle class="${kind}" cx="${x}" cy="${y}" r="2.8"/>`;
}

/** Each series is named at its right end, moved apart where they would cover each other. */
function labels(all: readonly PlotSeries[], y: ScaleLinear<number, number>): string {
  const right = WIDTH - EDGE.right;
  const placed = all
    .flatMap((series) => {
      const last = series.points.filter((point) => point.y !== null).at(-1);
      return last === undefined || series.label === '' ? [] : [{ series, at: y(last.y as number) }];
    })
    .sort((a, b) => a.at - b.at);
  placed.forEach((label, i) => {
    const above = placed[i - 1];
    if (above !== undefined) label.at = Math.max(label.at, above.at + 13);
  });
  const lowest = y.range()[0] as number;
  for (let i = placed.length - 1, most = lowest - 4; i >= 0; i--, most -= 13) {
    const label = placed[i] as { at: number };
    label.at = Math.min(label.at, most);
  }
  return placed
    .map(({ series, at }) => {
      const isMarked = series.marks === true || series.unjoined === true;
      const sample = isMarked
        ? mark(series, right + 13, round(at))
        : `<line class="line" x1="${right + 4}" x2="${right + 22}" y1="${round(at)}" y2="${round(at)}" stroke-dasharray="${DASHES[series.look]}"/>`;
      return `${sample}<text class="label" x="${right + 26}" y="${round(at)}" dy="0.32em">${escapeText(series.label)}</text>`;
    })
    .join('');
}

function round(value: number): number {
  return Math.round(10 * value) / 10;
}
