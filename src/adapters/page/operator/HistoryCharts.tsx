import { useRef, useState } from 'preact/hooks';
import type uPlot from 'uplot';
import { dateClock, hoursText, percent, power } from '../lib/format.js';
import type { UnitEntry } from '../lib/model.js';
import { api } from '../lib/page.js';
import { type ChartColumns, chartColumns, hoursColumns } from '../lib/series.js';
import { useAnswer } from '../lib/useAnswer.js';
import type { History } from '../lib/wire.js';
import { Chart } from '../parts/Chart.js';
import { Choices } from '../parts/Choices.js';
import { chartOptions } from '../parts/chartOptions.js';
import { useHeld } from '../parts/useHeld.js';
import { useSettled } from '../parts/useSettled.js';

const SPANS = [
  { value: '6', label: '6 h' },
  { value: '24', label: '24 h' },
  { value: '168', label: '7 days' },
];
const CHARGE = 'state_of_charge';
const POINTS = 400;
const AT_MOST_EVERY_MS = 5_000;

interface Drawn {
  readonly history: History;
  readonly charge: ChartColumns;
  readonly hours: ChartColumns;
}

/** State of charge and hours over the last hours or days, two charts above one another. */
export function HistoryCharts({ entry }: { entry: UnitEntry }) {
  const [span, setSpan] = useState('24');
  const [told, setTold] = useState('');
  const { definition } = entry;
  const columns = definition === null ? null : hoursColumns(definition);
  const names = columns?.columns ?? [];

  const span_ms = Number(span) * 3_600_000;
  const to = Date.parse(entry.state?.estimate?.time ?? '') || 0;
  // Ask again once a further point would be seen, and not for every scan of a fast recording.
  const step_ms = Math.min(span_ms / POINTS, 60_000);
  const newest = useSettled(Math.ceil(to / step_ms) * step_ms, AT_MOST_EVERY_MS);
  const ready = definition !== null && newest > 0;
  const key = useHeld(ready ? `${entry.unit} ${span} ${newest}` : null);
  const { answer, fault } = useAnswer<Drawn>(key, async (signal) => {
    const from = new Date(newest - span_ms);
    const wanted = [CHARGE, ...names];
    const history = await api.history(entry.unit, from, new Date(newest), POINTS, wanted, signal);
    return {
      history,
      charge: chartColumns(history, [CHARGE], 100),
      hours: chartColumns(history, names, 1),
    };
  });
  // A chart keeps the function that it was made with.
  const latest = useRef(answer);
  latest.current = answer;

  /** The figures under the cursor, in words below the charts. */
  function tell(chart: uPlot): void {
    const index = chart.cursor.idx;
    if (index === null || index === undefined || latest.current === null) return;
    setTold(wordsAt(latest.current.history, chart.data[0][index], names[1]));
  }

  return (
    <section id="history" aria-labelledby="history-head" tabIndex={-1}>
      <h2 id="history-head">History</h2>
      <Choices legend="Span" name="span" options={SPANS} chosen={span} onChoose={setSpan} />
      <div class="charts">
        {answer !== null && (
          <>
            <p class="when">State of charge, %</p>
            <Chart
              kind="charge"
              title="State of charge, %"
              data={answer.charge}
              options={(width) => chartOptions('charge', width, tell)}
            />
          </>
        )}
        {answer !== null && columns !== null && (
          <>
            <p class="when">{hoursTitle(columns.power_MW)}</p>
            <Chart
              kind="hours"
              title={hoursTitle(columns.power_MW)}
              data={answer.hours}
              options={(width) => chartOptions('hours', width, tell)}
            />
          </>
        )}
      </div>
      <p class="when" data-field="cursor">
        {told}
      </p>
      <p class={fault === null ? 'when' : 'fault'} role="status">
        {to === 0 || answer?.history.rows.length === 0
          ? 'Nothing is stored for this span yet.'
          : fault}
      </p>
    </section>
  );
}

const hoursTitle = (power_MW: number) =>
  `Hours left at ${power(power_MW)} MW electric, p50; p90 to p10 shaded`;

function wordsAt(history: History, second: number | undefined, middle: string | undefined): string {
  const row = history.rows.find((one) => Date.parse(String(one.time)) / 1000 === second);
  if (row === undefined) return '';
  const charge = row[CHARGE];
  const hours = middle === undefined ? null : row[middle];
  const parts = [dateClock(String(row.time))];
  if (typeof charge === 'number') parts.push(`${percent(charge)} % charged`);
  if (typeof hours === 'number') parts.push(`p50 ${hoursText(hours)}`);
  return parts.join(' · ');
}
