import type uPlot from 'uplot';
import type { History, UnitDefinition } from '../lib/wire.js';

export type ChartKind = 'charge' | 'hours';

const HEIGHT = 118;

function ink(name: string): string {
  return getComputedStyle(document.documentElement).getPropertyValue(name).trim();
}

interface HoursSeries {
  /** p90, p50, p10. */
  columns: [string, string, string];
  power_MW: number | null;
}

/**
 * The stored series of hours: those at rated power if they are stored by power
 * (`hours_p50_at_2_MW`), else the plain ones (`hours_p50`).
 */
export function hoursSeries(
  series: readonly string[],
  definition: UnitDefinition | null,
): HoursSeries | null {
  const powers = definition?.hours_at_MW_el ?? [];
  const rated = definition?.rated_power_MW_el ?? 0;
  const byNearness = [...powers].sort((a, b) => Math.abs(a - rated) - Math.abs(b - rated));
  const candidates = [
    ...byNearness.map((power) => ({ power_MW: power, tail: `_at_${power}_MW` })),
    { power_MW: null, tail: '' },
  ];
  for (const { power_MW, tail } of candidates) {
    const columns: HoursSeries['columns'] = [
      `hours_p90${tail}`,
      `hours_p50${tail}`,
      `hours_p10${tail}`,
    ];
    if (columns.every((column) => series.includes(column))) return { columns, power_MW };
  }
  return null;
}

/** Columns of uPlot: seconds since 1970, then one array per series; what is missing stays a gap. */
export function seriesValues(
  history: History,
  columns: readonly string[],
  scale: number,
): uPlot.AlignedData {
  const seconds = history.rows.map((row) => Date.parse(String(row.time)) / 1000);
  const values = columns.map((column) =>
    history.rows.map((row) => {
      const value = row[column];
      return typeof value === 'number' ? value * scale : null;
    }),
  );
  return [seconds, ...values];
}

export function chartOptions(
  kind: ChartKind,
  width: number,
  tell: (chart: uPlot) => void,
): uPlot.Options {
  const [line, soft, rule, band] = ['--ink', '--soft', '--rule', '--band'].map(ink) as [
    string,
    string,
    string,
    string,
  ];
  const axis = { stroke: soft, font: '12px system-ui, sans-serif' };
  const grid = { stroke: rule, width: 1 };
  const thin = { stroke: soft, width: 1 };
  return {
    width,
    height: HEIGHT,
    legend: { show: false },
    cursor: { sync: { key: 'history' }, drag: { x: false, y: false }, points: { size: 7 } },
    scales: {
      y: { range: kind === 'charge' ? [0, 100] : (_u, _min, max) => [0, Math.max(1, max * 1.08)] },
    },
    axes: [
      { ...axis, grid, ticks: grid, values: timeTicks },
      { ...axis, grid, ticks: grid, size: 40, space: 20 },
    ],
    series:
      kind === 'charge'
        ? [{}, { stroke: line, width: 2 }]
        : [{}, { ...thin }, { stroke: line, width: 2, dash: [6, 3] }, { ...thin }],
    ...(kind === 'hours' ? { bands: [{ series: [3, 1] as [number, number], fill: band }] } : {}),
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
