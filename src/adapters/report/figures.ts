import type { ReportData, ReportPoint, ReportStorePoint } from '../../core/report/reportData.js';
import { hoursOf } from '../../core/report/totals.js';
import type { CycleRecord, StoreRun } from '../../core/watch/cycleRecord.js';
import { escapeText as text } from './escape.js';
import { LOOKS, type PlotPoint, type PlotSeries, plot } from './plot.js';
import { degC } from './tables.js';

/** The plots of a report, each with what it shows in a sentence. */
export function figures(data: ReportData): string {
  return [
    '<section class="page"><h2>Fronts over the runs</h2>',
    widths(data),
    ratios(data),
    '</section><section><h2>Heat transfer and flow</h2>',
    transfer(data),
    ...data.stores.map(({ id }) => flows(data, id)),
    '</section><section><h2>Charge and efficiency</h2>',
    charge(data),
    trips(data),
    losses(data),
    '</section><section><h2>Temperatures along the beds</h2>',
    profiles(data),
    '</section>',
  ].join('\n');
}

function figure(picture: string, words: string): string {
  return `<figure>${picture}<figcaption>${text(words)}</figcaption></figure>`;
}

function timeOf(data: ReportData) {
  return { kind: 'time', from: Date.parse(data.from), to: Date.parse(data.to) } as const;
}

const look = (i: number) => LOOKS[i % LOOKS.length] as (typeof LOOKS)[number];

/** One series per store from its runs, at the run's middle. */
function overRuns(
  data: ReportData,
  pick: (run: StoreRun, cycle: CycleRecord) => Omit<PlotPoint, 'x'>,
): PlotSeries[] {
  return data.stores.map(({ id }, i) => ({
    ...{ label: id, look: look(i), marks: true },
    points: data.cycles.flatMap((cycle) => {
      const run = cycle.stores[id];
      if (run === undefined) return [];
      const point = pick(run, cycle);
      if (point.y === null) return [];
      return [{ x: (Date.parse(cycle.from) + Date.parse(cycle.to)) / 2, ...point }];
    }),
  }));
}

/** Nearest to the middle of the bed, where most runs pass. */
function atMiddle(run: StoreRun) {
  const sorted = run.widths
    .filter(({ width_m }) => width_m !== null)
    .sort((a, b) => a.place_m - b.place_m);
  return sorted[sorted.length >> 1];
}

function widths(data: ReportData): string {
  const series = overRuns(data, (run) => {
    const width = atMiddle(run);
    return { y: width?.width_m ?? null, sigma: width?.width_sigma_m ?? null };
  });
  return figure(
    plot({
      title: 'Width of the fronts',
      y_label: 'width [m]',
      x: timeOf(data),
      series,
      hold: [0],
    }),
    'Width of each front where it passed nearest to the middle of the bed, with one sigma. A wider front gives fewer hours from the same heat.',
  );
}

function ratios(data: ReportData): string {
  const limit = data.indicators.find(({ kind }) => kind === 'spread_ratio')?.limit;
  const series = overRuns(data, (run) => ({ y: atMiddle(run)?.spread_ratio ?? null }));
  return figure(
    plot({
      ...{ title: 'Spread ratio', y_label: 'spread ratio [-]', x: timeOf(data), series, hold: [1] },
      ...(limit === undefined ? {} : { limit: { value: limit, word: 'limit' } }),
    }),
    'Width over that of a healthy bed after the same flows and inlets: 1 is healthy, whatever the width.',
  );
}

function transfer(data: ReportData): string {
  const series = overRuns(data, (run) => ({
    y: run.heat_transfer_factor,
    sigma: run.heat_transfer_factor_sigma,
  }));
  return figure(
    plot({
      title: 'Heat-transfer factor',
      y_label: 'factor [-]',
      x: timeOf(data),
      series,
      hold: [0],
    }),
    'Heat transfer between gas and rock over the published correlation, at the end of each run, with one sigma. It falls with dust and fines.',
  );
}

function flows(data: ReportData, store: string): string {
  const strings = data.stores.find(({ id }) => id === store)?.strings ?? [];
  const series = strings.map((id, i) => ({
    ...{ label: id, look: look(i), marks: true },
    points: data.cycles.flatMap((cycle) => {
      const factor = cycle.stores[store]?.flow_factors[id];
      if (factor === undefined || cycle.kind === 'stand') return [];
      return [{ x: Date.parse(cycle.to), y: factor }];
    }),
  }));
  return figure(
    plot({
      ...{ title: `Flow factors of ${store}`, y_label: 'flow factor [-]', x: timeOf(data), series },
      ...{ hold: [0.95, 1.05], height: 150 },
    }),
    `Store ${store}: flow at each string over what the meter says for its share of the bed. Strings that part show a channel; all together the meter.`,
  );
}

function seriesOf(data: ReportData, pick: (point: ReportPoint) => number | null): PlotPoint[] {
  return data.series.map((point) => ({ x: Date.parse(point.time), y: pick(point) }));
}

function charge(data: ReportData): string {
  const percent = (share: number | null | undefined) => (share == null ? null : 100 * share);
  const ofStore = (id: string, pick: keyof Pick<ReportStorePoint, 'soc'>) =>
    seriesOf(data, ({ stores }) => percent(stores[id]?.[pick]));
  const series: PlotSeries[] = data.stores.map(({ id }, i) => ({
    ...{ label: id, look: look(i + 1), points: ofStore(id, 'soc') },
  }));
  const unit = seriesOf(data, ({ state_of_charge }) => percent(state_of_charge));
  series.unshift({ label: 'unit', look: 'solid', points: unit });
  return figure(
    plot({ title: 'State of charge', y_label: '%', x: timeOf(data), series, hold: [0, 100] }),
    'State of charge of the unit (dispatchable over rated energy) and of each store (heat between its references).',
  );
}

function trips(data: ReportData): string {
  const points = data.cycles.flatMap(({ to, round_trip }) =>
    round_trip === null ? [] : [{ x: Date.parse(to), y: 100 * round_trip }],
  );
  return figure(
    plot({
      ...{ title: 'Round-trip efficiency', y_label: '%', x: timeOf(data), height: 140 },
      series: [{ label: 'round trip', look: 'solid', points, marks: true }],
    }),
    'Electricity delivered over electricity drawn since the stores last held the same, for each discharge that closed such a cycle.',
  );
}

/** A shorter rest loses less than its sigma. */
const LEAST_REST_H = 2;

function losses(data: ReportData): string {
  const series = overRuns(data, (run, cycle) => {
    const hours = hoursOf(cycle);
    if (cycle.kind !== 'stand' || hours < LEAST_REST_H || run.lost_MWh_th === null)
      return { y: null };
    const sigma = run.lost_sigma_MWh_th === null ? null : (1000 * run.lost_sigma_MWh_th) / hours;
    return { y: (1000 * run.lost_MWh_th) / hours, sigma };
  });
  return figure(
    plot({
      title: 'Standing loss',
      y_label: 'kW_th',
      x: timeOf(data),
      series,
      hold: [0],
      height: 140,
    }),
    `Heat or cold lost per hour in each stand of ${LEAST_REST_H} h or more, with the most that its sigma can be.`,
  );
}

function profiles(data: ReportData): string {
  if (data.profiles.length === 0) return '<p class="empty">No profile was kept in this span.</p>';
  return data.stores
    .map(({ id, length_m, reference_hot_K, reference_cold_K }) => {
      const series: PlotSeries[] = data.profiles.flatMap((profile, i): PlotSeries[] => {
        const own = profile.stores[id];
        if (own === undefined) return [];
        const dots = (rejected: boolean) =>
          own.readings
            .filter((r) => r.value_K !== null && r.rejected === rejected)
            .map((r) => ({ x: r.position_m, y: degC(r.value_K as number) }));
        return [
          {
            ...{ label: String(i + 1), look: look(i) },
            points: own.x_m.map((x, k) => ({ x, y: degC(own.mean_K[k] as number) })),
          },
          { label: '', look: look(i), unjoined: true, points: dots(false) },
          { label: '', look: look(i), unjoined: true, hollow: true, points: dots(true) },
        ];
      });
      const times = data.profiles
        .map(
          ({ time, words }, i) => `${i + 1}: ${time.slice(5, 10)} ${time.slice(11, 16)}, ${words}`,
        )
        .join('; ');
      return figure(
        plot({
          ...{ title: `Temperatures along ${id}`, y_label: 'degC', series, height: 210 },
          x: { kind: 'place', from: 0, to: length_m, label: 'x [m]' },
          hold: [degC(reference_hot_K), degC(reference_cold_K)],
        }),
        `Store ${id}: estimate (lines) and thermocouples (marks; hollow: not believed), x from the charge inlet. ${times}.`,
      );
    })
    .join('\n');
}
