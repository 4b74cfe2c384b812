import type { ReportData } from '../../core/report/reportData.js';
import { hoursOf } from '../../core/report/totals.js';

/**
 * The runs of a report as CSV after RFC 4180, one row per run and store: what a person wants in a
 * spreadsheet. Units stand in the names of the columns; an empty field is not known.
 */
export function reportCsv({ cycles, stores }: ReportData): string {
  const rows = cycles.flatMap((cycle) =>
    stores.map(({ id }) => {
      const run = cycle.stores[id];
      const at = (share: number) => run?.widths.find((width) => width.share === share);
      return [
        ...[cycle.no, cycle.kind, cycle.from, cycle.to, hoursOf(cycle), cycle.incomplete.join(' ')],
        ...[cycle.drawn_MWh_el, cycle.delivered_MWh_el, cycle.round_trip, id],
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
  return [HEAD, ...rows]
    .map((row) => row.map(field).join(','))
    .join('\r\n')
    .concat('\r\n');
}

const HEAD = [
  ...['run', 'kind', 'from', 'to', 'hours', 'incomplete'],
  ...['drawn_MWh_el', 'delivered_MWh_el', 'round_trip', 'store'],
  ...['soc_from', 'soc_to', 'carried_MWh_th', 'lost_MWh_th'],
  ...['25', '50', '75'].flatMap((p) => [`width_at_${p}_percent_m`, `spread_ratio_at_${p}_percent`]),
  ...['heat_transfer_factor', 'heat_transfer_factor_sigma', 'flow_factors'],
  ...['thermocouples_rejected', 'raised'],
];

function field(value: string | number | null | undefined): string {
  if (value === null || value === undefined) return '';
  const text = String(value);
  // A spreadsheet would take a text that begins like a formula for one.
  const safe = typeof value === 'string' && /^[=+\-@\t\r]/.test(text) ? `'${text}` : text;
  return /[",\r\n]/.test(safe) ? `"${safe.replaceAll('"', '""')}"` : safe;
}
