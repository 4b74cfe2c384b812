import uPlot from 'uplot';
import { AnswerError, type Api } from '../lib/api.js';
import { byId, choices, h, setText } from '../lib/dom.js';
import { dateClock, hoursText, percent, power } from '../lib/format.js';
import type { PageModel } from '../lib/model.js';
import { chartColumns, hoursColumns } from '../lib/series.js';
import type { History, UnitDefinition } from '../lib/wire.js';
import { type ChartKind, chartOptions } from './chart.js';

const SPANS_H = { '6': '6 h', '24': '24 h', '168': '7 days' } as const;
const CHARGE = 'state_of_charge';
const POINTS = 400;
const AT_MOST_EVERY_MS = 5_000;
const AT_LEAST_EVERY_MS = 60_000;

/** State of charge and hours over the last hours or days, two charts above one another. */
export function historyPanel(model: PageModel, api: Api): () => void {
  let span_h = 24;
  const fault = h('p', { class: 'fault', role: 'status' });
  const now = h('p', { class: 'when', 'data-field': 'cursor' });
  const holder = h('div', { class: 'charts' });
  byId('history').append(
    choices(
      'Span',
      'span',
      Object.entries(SPANS_H).map(([value, label]) => ({ value, label })),
      '24',
      (value) => {
        span_h = Number(value);
        shownFor = '';
        model.changed();
      },
    ),
    holder,
    now,
    fault,
  );

  const charts: uPlot[] = [];
  let history: History | null = null;
  /** Which hours the history carries. */
  let hours: ReturnType<typeof hoursColumns> = null;
  let shownFor = '';
  let asked_ms = Number.NEGATIVE_INFINITY;
  let asking = false;

  function draw(): void {
    for (const chart of charts) chart.destroy();
    charts.length = 0;
    holder.replaceChildren();
    if (history === null || holder.clientWidth === 0) return;
    addChart('charge', 'State of charge, %', [CHARGE], 100);
    if (hours === null) return;
    const title = `Hours left at ${power(hours.power_MW)} MW electric: p50 dashed, p90 to p10 shaded`;
    addChart('hours', title, hours.columns, 1);
  }

  function addChart(kind: ChartKind, title: string, columns: readonly string[], scale: number) {
    const box = h('div', { class: 'chart', role: 'img', 'data-chart': kind, 'aria-label': title });
    holder.append(h('p', { class: 'when' }, title), box);
    const data = chartColumns(history!, columns, scale) as uPlot.AlignedData;
    charts.push(new uPlot(chartOptions(kind, box.clientWidth, tell), data, box));
  }

  /** The figures under the cursor, in words below the charts. */
  function tell(chart: uPlot): void {
    const index = chart.cursor.idx;
    if (index === null || index === undefined || history === null) return;
    const time = chart.data[0][index];
    const row = history.rows.find((one) => Date.parse(String(one.time)) / 1000 === time);
    if (row === undefined) return;
    const charge = row[CHARGE];
    const middle = hours === null ? null : row[hours.columns[1]];
    const parts = [dateClock(String(row.time))];
    if (typeof charge === 'number') parts.push(`${percent(charge)} % charged`);
    if (typeof middle === 'number') parts.push(`p50 ${hoursText(middle)}`);
    setText(now, parts.join(' · '));
  }

  async function load(definition: UnitDefinition, to: Date): Promise<void> {
    const { unit } = definition;
    const wanted = hoursColumns(definition);
    asking = true;
    asked_ms = performance.now();
    const from = new Date(to.getTime() - span_h * 3_600_000);
    try {
      const found = await api.history(unit, from, to, POINTS, [CHARGE, ...(wanted?.columns ?? [])]);
      if (unit !== model.selected) return;
      history = found;
      hours = wanted;
      setText(fault, found.rows.length === 0 ? 'Nothing is stored for this span yet.' : '');
      draw();
    } catch (error) {
      setText(fault, error instanceof AnswerError ? error.message : String(error));
    } finally {
      asking = false;
    }
  }

  let width = 0;
  new ResizeObserver(() => {
    if (holder.clientWidth === width) return;
    width = holder.clientWidth;
    draw();
  }).observe(holder);
  // The canvas takes its inks from the style sheet when it is made.
  window.matchMedia('(prefers-color-scheme: dark)').addEventListener('change', draw);

  return () => {
    const entry = model.unit;
    const time = entry?.state?.estimate?.time;
    const definition = entry?.definition ?? null;
    if (
      entry === null ||
      definition === null ||
      time === undefined ||
      asking ||
      model.connection !== 'live'
    )
      return;
    const key = `${entry.unit} ${span_h}`;
    const to = Date.parse(time);
    const since = performance.now() - asked_ms;
    const newest = history === null ? 0 : Date.parse(history.to);
    // Ask again once a further point would be seen, and not for every scan of a fast recording.
    const moved = to - newest >= (span_h * 3_600_000) / POINTS || since > AT_LEAST_EVERY_MS;
    if (key === shownFor && (!moved || since < AT_MOST_EVERY_MS)) return;
    shownFor = key;
    void load(definition, new Date(to));
  };
}
