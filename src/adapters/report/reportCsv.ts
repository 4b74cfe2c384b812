import { findingsOf } from '../../core/report/findings.js';
import type { ReportData } from '../../core/report/reportData.js';
import { spreadsheetField } from '../../core/report/spreadsheet.js';
import { hoursOf } from '../../core/report/totals.js';

/** Tables of a report that can be had as CSV. */
export const REPORT_TABLES = ['runs', 'findings', 'indicators', 'thermocouples', 'events'] as const;
export type ReportTable = (typeof REPORT_TABLES)[number];

type Field = string | number | null | undefined;

/**
 * A table of a report as CSV after RFC 4180, for a spreadsheet. Units stand in the names of the
 * columns; an empty field is not known.
 */
export function reportCsv(data: ReportData, table: ReportTable = 'runs'): string {
  return TABLES[table](data)
    .map((row) => row.map(spreadsheetField).join(','))
    .join('\r\n')
    .concat('\r\n');
}

const TABLES: Readonly<Record<ReportTable, (data: ReportData) => Field[][]>> = {
  runs,
  findings: (data) => [
    ['level', 'subject', 'title', 'text', 'evidence', 'check'],
    ...findingsOf(data).map(({ level, subject, title, text, evidence, check }) => [
      ...[level, subject, title, text, evidence.join(' '), check],
    ]),
  ],
  indicators: ({ indicators }) => [
    [
      ...['indicator', 'subject', 'state', 'reason', 'value', 'sigma', 'unit', 'healthy'],
      ...['healthy_from', 'limit', 'decided', 'time', 'sentence'],
    ],
    ...indicators.map((v) => [
      ...[v.kind, v.subject, v.state, v.reason, v.value, v.sigma, v.unit, v.healthy],
      ...[v.healthy_from, v.limit, v.score, v.time, v.sentence],
    ]),
  ],
  thermocouples: ({ sensors }) => [
    ['thermocouple', 'store', 'string', 'position_m', 'group', 'verdict', 'since', 'evidence'],
    ...sensors.map((s) => [
      ...[s.id, s.store, s.string, s.position_m, s.group],
      ...[s.now?.verdict, s.now?.since, s.now?.evidence],
    ]),
  ],
  events: ({ events }) => [
    [
      'time',
      'id',
      'kind',
      'subject',
      'class',
      'priority',
      'transition',
      'value',
      'limit',
      'message',
    ],
    ...events.map((e) => [
      ...[e.time, e.id, e.kind, e.subject, e.class, e.priority, e.transition, e.value, e.limit],
      e.message,
    ]),
  ],
};

/** One row per run and store. */
function runs({ cycles, stores }: ReportData): Field[][] {
  const rows = cycles.flatMap((cycle) =>
    stores.map(({ id }) => {
      const run = cycle.stores[id];
      const at = (share: number) => run?.widths.find((width) => width.share === share);
      return [
        ...[cycle.no, cycle.kind, cycle.from, cycle.to, hoursOf(cycle), cycle.incomplete.join(' ')],
        ...[cycle.drawn_MWh_el, cycle.delivered_MWh_el, cycle.round_trip],
        ...[cycle.told?.end, cycle.told?.firm_end, id],
        ...[run?.soc_from, run?.soc_to, run?.carried_MWh_th, run?.lost_MWh_th],
        ...[0.25, 0.5, 0.75].flatMap((share) => [at(share)?.width_m, at(share)?.spread_ratio]),
        ...[run?.heat_transfer_factor, run?.heat_transfer_factor_sigma],
        run === undefined
          ? null
          : Object.entries(run.flow_factors)
              .map(([string, factor]) => `${string}=${factor}`)
              .join(' '),
        ...[run?.thermocouples_rejected, cycle.raised.join(' ')],
      ];
    }),
  );
  return [HEAD, ...rows];
}

const HEAD = [
  ...['run', 'kind', 'from', 'to', 'hours', 'incomplete'],
  ...['drawn_MWh_el', 'delivered_MWh_el', 'round_trip', 'told_end', 'told_firm_end', 'store'],
  ...['soc_from', 'soc_to', 'carried_MWh_th', 'lost_MWh_th'],
  ...['25', '50', '75'].flatMap((p) => [`width_at_${p}_percent_m`, `spread_ratio_at_${p}_percent`]),
  ...['heat_transfer_factor', 'heat_transfer_factor_sigma', 'flow_factors'],
  ...['thermocouples_rejected', 'raised'],
];
