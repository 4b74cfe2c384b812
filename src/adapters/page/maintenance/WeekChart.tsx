import { useState } from 'preact/hooks';
import { DASH, dateClock, fixed } from '../lib/format.js';
import type { ChartColumns } from '../lib/series.js';
import { Chart } from '../parts/Chart.js';
import { lastKnown } from './weekColumns.js';
import { type Line, weekOptions } from './weekOptions.js';

/** A chart over weeks with its title above and the figures under the cursor below. */
export function WeekChart({
  id,
  title,
  lines,
  band = null,
  digits = 2,
  data,
  empty,
}: {
  id: string;
  title: string;
  lines: readonly Line[];
  band?: readonly [number, number] | null;
  digits?: number;
  data: ChartColumns | null;
  /** What is said where there is nothing to draw. */
  empty: string;
}) {
  const [cursor, setCursor] = useState<number | null>(null);
  if (data === null || data[0].length === 0) {
    return (
      <figure class="rock-chart" data-empty="">
        <figcaption>{title}</figcaption>
        <p class="when">{empty}</p>
      </figure>
    );
  }
  const words = readout(lines, data, cursor, digits);
  const newest = readout(lines, data, null, digits);
  return (
    <figure class="rock-chart" data-chart-of={id}>
      <figcaption>{title}</figcaption>
      <Chart
        kind={`${id} ${lines.map(({ label }) => label).join(' ')}`}
        title={`${title}. ${newest}`}
        data={data}
        options={(width) => weekOptions(lines, band, width, setCursor)}
      />
      <p class="when">{words}</p>
    </figure>
  );
}

/** `2026-12-02 04:10:00: value 0.93, healthy 0.95`: under the cursor, else the newest of each line. */
function readout(
  lines: readonly Line[],
  data: ChartColumns,
  cursor: number | null,
  digits: number,
): string {
  const at = cursor ?? data[0].length - 1;
  const values = cursor === null ? newestOf(data) : lastKnown(data, at);
  const told = lines.flatMap(({ label }, k) => {
    const value = values[k] ?? null;
    if (label === '' || (cursor !== null && value === null)) return [];
    return [`${label} ${value === null ? DASH : fixed(value, digits)}`];
  });
  const when = cursor === null ? 'Newest' : dateClock((data[0][at] ?? 0) * 1000);
  return `${when}: ${told.length === 0 ? 'nothing stored' : told.join(', ')}`;
}

const newestOf = ([, ...lines]: ChartColumns): (number | null)[] =>
  lines.map((line) => line.findLast((value) => value !== null && value !== undefined) ?? null);
