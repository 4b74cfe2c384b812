import type { CycleView } from '../../core/watch/cycleView.js';
import { table } from '../table.js';

const DASH = '-';
const fixed = (value: number | null, digits: number): string =>
  value === null ? DASH : value.toFixed(digits);
const percent = (value: number | null): string =>
  value === null ? DASH : (value * 100).toFixed(1);
/** To the second. */
const moment = (iso: string): string => `${iso.slice(0, 19)}Z`;

/** Of the day, to the minute. */
const clock = (iso: string | undefined): string => (iso ? `${iso.slice(11, 16)}Z` : DASH);

const HEADER = [
  ...[
    'no',
    'kind',
    'from',
    'h',
    'drawn',
    'delivered',
    'charge %',
    'to %',
    'round trip %',
    'told end',
    'firm',
    'raised',
  ],
];
const STORE_HEADER = [
  ...['no', 'kind', 'store', 'charge %', 'to %', 'stored', 'to', 'carried', 'lost', 'sigma'],
  ...['widths m', 'spread', 'outlet degC', 'to degC'],
];

/** Runs for people: one line for each, then one for each store in it. */
export function cyclesText(unit: string, cycles: readonly CycleView[]): string {
  if (cycles.length === 0) return `${unit}: no run that is over`;
  const runs = cycles.map((run) => [
    ...[run.no, run.kind, moment(run.from), hours(run).toFixed(2)],
    ...[fixed(run.drawn_MWh_el, 3), fixed(run.delivered_MWh_el, 3)],
    ...[percent(run.soc_from), percent(run.soc_to), percent(run.round_trip)],
    ...[clock(run.told?.end), clock(run.told?.firm_end), run.raised.length],
  ]);
  const stores = cycles.flatMap((run) =>
    Object.entries(run.stores).map(([id, store]) => [
      ...[run.no, run.kind, id, percent(store.soc_from), percent(store.soc_to)],
      ...[fixed(store.stored_from_MWh_th, 2), fixed(store.stored_to_MWh_th, 2)],
      ...[fixed(store.carried_MWh_th, 2), fixed(store.lost_MWh_th, 2)],
      fixed(run.kind === 'stand' ? store.lost_sigma_MWh_th : null, 2),
      places(store.widths.map(({ width_m }) => width_m)),
      places(store.widths.map(({ spread_ratio }) => spread_ratio)),
      ...[fixed(store.outlet_from_degC, 1), fixed(store.outlet_to_degC, 1)],
    ]),
  );
  const marked = cycles.filter(({ incomplete }) => incomplete.length > 0);
  return [
    `${unit}: ${cycles.length} runs, to ${moment(cycles.at(-1)!.to)}`,
    table(HEADER, runs),
    '',
    table(STORE_HEADER, stores),
    ...marked.map(({ no, incomplete }) => `Run ${no} is incomplete: ${incomplete.join(', ')}.`),
    'MWh_el at the connection point, MWh_th in the stores; widths and spread ratios at a quarter,',
    'half and three quarters of the length, where the front passed them. Told end, firm: by p50 and',
    'p90, at the begin of a discharge and at its power.',
  ].join('\n');
}

function hours({ from, to }: CycleView): number {
  return (Date.parse(to) - Date.parse(from)) / 3_600_000;
}

function places(values: readonly (number | null)[]): string {
  return values.length === 0 ? DASH : values.map((value) => fixed(value, 2)).join(' ');
}
