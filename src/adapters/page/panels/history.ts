import uPlot from 'uplot';
import { AnswerError, type Api } from '../lib/api.js';
import { byId, choices, h, setText } from '../lib/dom.js';
import { dateClock } from '../lib/format.js';
import type { PageModel } from '../lib/model.js';
import type { History } from '../lib/wire.js';
import { type ChartKind, chartOptions, hoursSeries, seriesValues } from './chart.js';

const SPANS_H = { '6': '6 h', '24': '24 h', '168': '7 days' } as const;
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

  const charts = new Map<ChartKind, uPlot>();
  let history: History | null = null;
  let shownFor = '';
  let asked_ms = Number.NEGATIVE_INFINITY;
  let asking = false;

  function draw(): void {
    for (const chart of charts.values()) chart.destroy();
    charts.clear();
    holder.replaceChildren();
    if (history === null || holder.clientWidth === 0) return;
    const names = hoursSeries(history.series, model.unit?.definition ?? null);
    for (const kind of ['charge', 'hours'] as const) {
      if (kind === 'hours' && names === null) continue;
      const title = kind === 'charge' ? 'State of charge, %' : hoursTitle(names!.power_MW);
      const box = h('div', {
        class: 'chart',
        role: 'img',
        'data-chart': kind,
        'aria-label': title,
      });
      holder.append(h('p', { class: 'when' }, title), box);
      const columns = kind === 'charge' ? ['state_of_charge'] : names!.columns;
      const scale = kind === 'charge' ? 100 : 1;
      const options = chartOptions(kind, box.clientWidth, tell);
      charts.set(kind, new uPlot(options, seriesValues(history, columns, scale), box));
    }
  }

  /** The figures under the cursor, in words below the charts. */
  function tell(chart: uPlot): void {
    const index = chart.cursor.idx;
    const row = index === null || index === undefined ? undefined : history?.rows[index];
    if (row === undefined || history === null) return;
    const charge = row.state_of_charge;
    const names = hoursSeries(history.series, model.unit?.definition ?? null);
    const middle = names === null ? null : row[names.columns[1]!];
    const parts = [dateClock(String(row.time))];
    if (typeof charge === 'number') parts.push(`${(charge * 100).toFixed(1)} % charged`);
    if (typeof middle === 'number') parts.push(`p50 ${middle.toFixed(2)} h`);
    setText(now, parts.join(' · '));
  }

  async function load(unit: string, to: Date): Promise<void> {
    asking = true;
    asked_ms = performance.now();
    const from = new Date(to.getTime() - span_h * 3_600_000);
    try {
      const found = await api.history(unit, from, to, POINTS);
      if (unit !== model.selected) return;
      history = found;
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
    if (entry === null || time === undefined || asking || model.connection !== 'live') return;
    const key = `${entry.unit} ${span_h}`;
    const to = Date.parse(time);
    const since = performance.now() - asked_ms;
    const newest = history === null ? 0 : Date.parse(history.to);
    // Ask again once a further point would be seen, and not for every scan of a fast recording.
    const moved = to - newest >= (span_h * 3_600_000) / POINTS || since > AT_LEAST_EVERY_MS;
    if (key === shownFor && (!moved || since < AT_MOST_EVERY_MS)) return;
    shownFor = key;
    void load(entry.unit, new Date(to));
  };
}

function hoursTitle(power_MW: number | null): string {
  return `Hours left${power_MW === null ? '' : ` at ${power_MW} MW electric`}: p50 dashed, p90 to p10 shaded`;
}
