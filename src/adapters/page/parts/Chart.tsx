import { useEffect, useRef } from 'preact/hooks';
import uPlot from 'uplot';
import type { ChartColumns } from '../lib/series.js';
import { dark } from './dark.js';
import { useWidth } from './useWidth.js';

/**
 * A chart of series over time (uPlot). It is made anew where its width, its kind or light and dark
 * change, and only takes new data otherwise.
 *
 * @param kind says all that `options` depend on beside the width
 * @param options called with the width [px]
 * @param title what the chart shows, for those who do not see it
 */
export function Chart({
  kind,
  title,
  data,
  options,
}: {
  kind: string;
  title: string;
  data: ChartColumns;
  options(width: number): uPlot.Options;
}) {
  const { ref, width } = useWidth<HTMLDivElement>();
  const chart = useRef<uPlot | null>(null);
  const isDark = dark.value;
  const make = useRef(options);
  make.current = options;
  const latest = useRef(data);
  latest.current = data;
  useEffect(() => {
    if (ref.current === null || width === 0) return;
    const made = new uPlot(make.current(width), latest.current as uPlot.AlignedData, ref.current);
    chart.current = made;
    return () => {
      chart.current = null;
      made.destroy();
    };
  }, [ref, width, kind, isDark]);
  useEffect(() => chart.current?.setData(data as uPlot.AlignedData), [data]);
  return <div ref={ref} class="chart" role="img" data-chart={kind} aria-label={title} />;
}
