import { percent } from '../../core/report/findings.js';
import type { ReportData } from '../../core/report/reportData.js';
import { hoursOf } from '../../core/report/totals.js';
import { ZERO_CELSIUS_K } from '../../core/units.js';
import type { IndicatorView } from '../../core/watch/indicator.js';
import { escapeText as text } from './escape.js';

/** Rows beyond this are left out of the sheet, and said so; JSON and CSV have all. */
const MOST_RUNS = 120;
const MOST_EVENTS = 80;

interface Column {
  readonly head: string;
  readonly number?: boolean;
}

function table(columns: readonly Column[], rows: readonly (readonly string[])[]): string {
  const cell = (tag: string, i: number, content: string) =>
    `<${tag}${columns[i]?.number ? ' class="n"' : ''}>${content}</${tag}>`;
  const head = columns.map(({ head }, i) => cell('th', i, head)).join('');
  const body = rows.map((row) => `<tr>${row.map((c, i) => cell('td', i, c)).join('')}</tr>`);
  return `<div class="wide"><table><thead><tr>${head}</tr></thead><tbody>${body.join('')}</tbody></table></div>`;
}

const n = (head: string): Column => ({ head, number: true });
const t = (head: string): Column => ({ head });

export function indicatorTable({ indicators }: ReportData): string {
  if (indicators.length === 0) return '<p class="empty">None was kept in this span.</p>';
  const rows = indicators.map((view) => [
    text(view.kind.replaceAll('_', ' ')),
    text(view.subject),
    view.state === 'degraded' ? '<span class="bad">degraded</span>' : stateWords(view),
    withSigma(view),
    view.healthy === null
      ? '-'
      : `${short(view.healthy)} <span class="soft">${view.healthy_from ?? ''}</span>`,
    view.unit === '-' ? short(view.limit) : `${short(view.limit)} ${text(view.unit)}`,
    view.score === null ? '-' : percent(view.score),
  ]);
  const heads = [
    t('indicator'),
    t('of'),
    t('state'),
    n('value'),
    n('healthy'),
    n('limit'),
    n('decided'),
  ];
  return `${table(heads, rows)}<p class="soft">Decided: how far the sequential test has come; 100 % is a decision. A healthy indicator is called degraded at most once in the configured in-control time, in the mean; those of a unit add up (the facts of the configuration tell it).</p>`;
}

function stateWords({ state, reason }: IndicatorView): string {
  return reason === null
    ? state
    : `${state} <span class="soft">${reason.replaceAll('_', ' ')}</span>`;
}

/** To two digits of the sigma. */
function withSigma({ value, sigma }: IndicatorView): string {
  if (value === null) return '-';
  if (sigma === null || sigma === 0) return short(value);
  const digits = Math.min(5, Math.max(0, 1 - Math.floor(Math.log10(sigma))));
  return `${value.toFixed(digits)} +/- ${sigma.toFixed(digits)}`;
}

/** Three significant digits, as a plain number. */
function short(value: number): string {
  if (value === 0) return '0';
  const digits = Math.max(0, 2 - Math.floor(Math.log10(Math.abs(value))));
  return value.toFixed(Math.min(5, digits));
}

/** A store as it hangs: one row per height, one column per string; then what was not believed and when. */
export function sensorTable(data: ReportData): string {
  const all = data.sensors;
  const grids = data.stores.map(({ id, strings }) => {
    const own = all.filter(({ store }) => store === id);
    const heights = [...new Set(own.map(({ position_m }) => position_m))].sort((a, b) => a - b);
    const rows = heights.map((x) => [
      x.toFixed(2),
      ...strings.map((string) => {
        const here = own.find((s) => s.string === string && s.position_m === x);
        return here === undefined ? '' : sensorCell(here);
      }),
    ]);
    const heads = [n('x [m]'), ...strings.map((string) => t(text(string)))];
    return `<div><h3>Store ${text(id)}</h3>${table(heads, rows)}</div>`;
  });
  const told = all.filter(({ now, verdicts }) => now !== null || verdicts.length > 0);
  const rows = told.map(({ id, store, group, now, verdicts }) => [
    text(id),
    text(store),
    text(group ?? '-'),
    now === null
      ? 'believed'
      : `${text(now.verdict.replaceAll('_', ' '))} since ${minuteOf(now.since)}: ${text(now.evidence)}`,
    verdicts.length === 0
      ? '-'
      : verdicts
          .slice(-3)
          .map(
            ({ from, until }) =>
              `${minuteOf(from)} to ${until === null ? 'the end' : minuteOf(until)}`,
          )
          .join('<br>'),
  ]);
  const heads = [t('thermocouple'), t('store'), t('group'), t('at the end'), t('not believed')];
  const list =
    told.length === 0 ? '<p>Every thermocouple was believed throughout.</p>' : table(heads, rows);
  return `<div class="grids">${grids.join('')}</div>${list}`;
}

function sensorCell({ now, verdicts }: ReportData['sensors'][number]): string {
  if (now !== null) return `<span class="bad">${text(now.verdict.replaceAll('_', ' '))}</span>`;
  return verdicts.length > 0 ? 'believed again' : '<span class="soft">believed</span>';
}

export function cycleTable({ cycles, stores }: ReportData): string {
  if (cycles.length === 0) return '<p class="empty">No run ended in this span.</p>';
  const shown = cycles.slice(-MOST_RUNS);
  const rows = shown.map((cycle) => [
    minuteOf(cycle.from),
    cycle.kind + (cycle.incomplete.length > 0 ? ' *' : ''),
    hoursOf(cycle).toFixed(1),
    number(cycle.drawn_MWh_el, 2),
    number(cycle.delivered_MWh_el, 2),
    ...stores.flatMap(({ id }) => {
      const run = cycle.stores[id];
      const width = run?.widths.find(({ width_m }) => width_m !== null);
      return [
        run === undefined
          ? '-'
          : `${(100 * run.soc_from).toFixed(0)} to ${(100 * run.soc_to).toFixed(0)}`,
        number(run?.lost_MWh_th ?? null, 2),
        number(width?.width_m ?? null, 2),
      ];
    }),
    ...[clockOf(cycle.told?.end), clockOf(cycle.told?.firm_end)],
    cycle.round_trip === null ? '-' : percent(cycle.round_trip),
    String(cycle.raised.length || '-'),
  ]);
  const heads = [
    ...[t('from'), t('run'), n('h'), n('drawn MWh el'), n('given MWh el')],
    ...stores.flatMap(({ id }) => [
      n(`${text(id)} charge %`),
      n(`${text(id)} lost MWh th`),
      n(`${text(id)} width m`),
    ]),
    ...[n('told end'), n('firm end'), n('round trip'), n('raised')],
  ];
  const left = cycles.length - shown.length;
  const notes = [
    ...(left > 0 ? [`${left} earlier runs are left out here; JSON and CSV have all.`] : []),
    ...(cycles.some((c) => c.incomplete.length > 0)
      ? ['* has a gap, an unknown flow or power, or began before the record.']
      : []),
    ...(cycles.some(({ told }) => told !== null)
      ? [
          'Told end: when a discharge would end at its power, as told at its begin; firm: not before, with 90 % certainty. It may have been ended earlier by choice.',
        ]
      : []),
    'Width: where the front first passed a quarter, the middle or three quarters of the bed.',
  ];
  return `${table(heads, rows)}<p class="soft">${notes.join(' ')}</p>`;
}

/** Of the day, to the minute. */
const clockOf = (iso: string | undefined): string => iso?.slice(11, 16) ?? '-';

export function eventTable({ events, alarms }: ReportData): string {
  const figures =
    alarms === null
      ? ''
      : `<p>${alarms.annunciated} alarms annunciated, ${alarms.per_day.toFixed(1)} a day, at most ${alarms.most_in_10_min} in 10 min, ${alarms.floods === 0 ? 'no flood' : `${alarms.floods} floods, ${percent(alarms.share_in_flood)} of the time`}. ${
          alarms.chattering.length > 0
            ? `Chattering: ${text(alarms.chattering.join(', '))}.`
            : 'None chattered.'
        }</p>`;
  if (events.length === 0) return `${figures}<p class="empty">None in this span.</p>`;
  const all = grouped(events);
  const shown = all.slice(0, MOST_EVENTS);
  const rows = shown.map(({ last, count, first, until }) => [
    last.class,
    String(count),
    minuteOf(first),
    until === null ? '<b>stands</b>' : minuteOf(until),
    text(last.message),
  ]);
  const heads = [t(''), n('raised'), t('first'), t('returned'), t('what it said last')];
  const left = all.length - shown.length;
  return `${figures}${table(heads, rows)}${
    left > 0 ? `<p class="soft">${left} more are left out here; JSON and CSV have all.</p>` : ''
  }`;
}

interface Told {
  readonly first: string;
  count: number;
  /** When it returned last; null while it stands. */
  until: string | null;
  last: ReportData['events'][number];
}

/** One entry per alarm or alert: what stands first, then what came most often. */
function grouped(events: ReportData['events']): Told[] {
  const found = new Map<string, Told>();
  for (const event of events) {
    const known = found.get(event.id);
    const raised = event.transition === 'raised';
    if (known === undefined) {
      const until = raised ? null : event.time;
      found.set(event.id, { first: event.time, count: raised ? 1 : 0, until, last: event });
      continue;
    }
    known.until = raised ? null : event.time;
    if (!raised) continue;
    known.count++;
    known.last = event;
  }
  const rank = ({ until, last }: Told) =>
    (until === null ? 0 : 2) + (last.class === 'alarm' ? 0 : 1);
  return [...found.values()].sort((x, y) => rank(x) - rank(y) || y.count - x.count);
}

function number(value: number | null, digits: number): string {
  if (value === null) return '-';
  // A rounded loss of nothing has no sign.
  return value.toFixed(digits).replace(/^-(0\.?0*)$/, '$1');
}

function minuteOf(iso: string): string {
  return `<span class="time">${iso.slice(5, 10)} ${iso.slice(11, 16)}</span>`;
}

export function degC(kelvin: number): number {
  return kelvin - ZERO_CELSIUS_K;
}
