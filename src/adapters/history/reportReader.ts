import type { StoreConfig } from '../../config/site.js';
import { alarmFigures } from '../../core/alarm/figures.js';
import type { StoreDefinition, UnitDefinition } from '../../core/definitions.js';
import { type Estimate, QUALITIES, type Quality } from '../../core/estimate.js';
import type {
  ReportAlarmFigures,
  ReportData,
  ReportPoint,
  ReportProfile,
  ReportReadings,
  ReportSensor,
} from '../../core/report/reportData.js';
import type { CycleRecord } from '../../core/watch/cycleRecord.js';
import type { WatchEvent } from '../../core/watch/event.js';
import type { History } from './history.js';

export interface ReportAsk {
  readonly site: string;
  readonly version: string;
  readonly from_ms: number;
  readonly to_ms: number;
  /** When it is made [ms since 1970]. */
  readonly made_ms: number;
  /** Before this time the history keeps one estimate in so many seconds alone. */
  readonly thinned_before_ms: number;
  readonly thinned_to_s: number;
  /** Times whose profiles are shown; empty: the ends of the last runs of each kind [ms]. */
  readonly profiles_at_ms: readonly number[];
}

/** Points of a plotted series; more than the sheet has pixels would not show. */
const POINTS = 700;
const MOST_EVENTS = 20_000;
const MOST_CYCLES = 20_000;
/** A profile is kept every ten minutes; one further off is of another moment. */
const NEAR_MS = 900_000;
const DAY_MS = 86_400_000;
const TEN_MINUTES_MS = 600_000;

/** Gathers from the local history all that a report of a unit over a span is made of. */
export function gatherReport(history: History, unit: UnitDefinition, ask: ReportAsk): ReportData {
  const { from_ms, to_ms } = ask;
  const iso = (ms: number) => new Date(ms).toISOString();
  const cycles = history.cycles
    .between(unit.id, from_ms, to_ms, undefined, MOST_CYCLES)
    .filter(({ to }) => Date.parse(to) > from_ms && Date.parse(to) <= to_ms);
  const found = history.events.between(unit.id, from_ms, to_ms, MOST_EVENTS + 1);
  const events = found.slice(0, MOST_EVENTS).reverse();
  const latest = history.estimates.newestUntil(unit.id, from_ms, to_ms);
  const watch = history.watch.newestUntil(unit.id, from_ms, to_ms);
  const [first] = history.watch.between(unit.id, from_ms, to_ms, 1);
  return {
    site: ask.site,
    unit: unit.id,
    unit_name: unit.name,
    version: ask.version,
    ...{ from: iso(from_ms), to: iso(to_ms), made: iso(ask.made_ms) },
    rated: { power_MW_el: unit.rated_power_W / 1e6, hours: unit.rated_hours },
    stores: unit.stores.map(aboutStore),
    readings: readingsOf(history, unit, ask),
    series: seriesOf(history, unit, from_ms, to_ms),
    cycles,
    profiles: profilesOf(history, unit, cycles, ask),
    sensors: unit.stores.flatMap((store) => sensorsOf(unit, store, latest, events)),
    indicators: watch?.indicators ?? [],
    causes: watch?.causes ?? [],
    events,
    older_events_left_out: found.length > MOST_EVENTS,
    degraded_at_start: (first?.indicators ?? [])
      .filter(({ state }) => state === 'degraded')
      .map(({ kind, subject }) => ({ kind, subject })),
    alarms: figuresOf(history, unit, from_ms, to_ms),
  };
}

function aboutStore(store: StoreDefinition): ReportData['stores'][number] {
  const { id, kind, bed, reference_hot_K, reference_cold_K, strings } = store;
  return {
    ...{ id, kind, reference_hot_K, reference_cold_K },
    length_m: bed.length_m,
    strings: strings.map((string) => string.id),
  };
}

/** Scans by quality, and how much of the span has none. */
function readingsOf(
  history: History,
  unit: UnitDefinition,
  { from_ms, to_ms, thinned_before_ms, thinned_to_s }: ReportAsk,
): ReportReadings {
  const counts = new Map<Quality, number>();
  // A scan may be late by its deadline; only what is missing beyond two periods counts. Of older times
  // less is kept: there a gap is what is longer than two of those.
  const usual_ms = (time_ms: number) =>
    2000 *
    (time_ms < thinned_before_ms ? Math.max(thinned_to_s, unit.scan_period_s) : unit.scan_period_s);
  let before_ms = from_ms;
  let [scans, longest_ms, missing_ms] = [0, 0, 0];
  const gap = (time_ms: number) => {
    const beyond = time_ms - before_ms;
    if (beyond > usual_ms(before_ms)) {
      missing_ms += beyond;
      longest_ms = Math.max(longest_ms, beyond);
    }
    before_ms = time_ms;
  };
  for (const { time_ms, values } of history.estimates.rows(unit.id, from_ms, to_ms, ['quality'])) {
    const quality = QUALITIES[values[0] ?? -1];
    if (quality !== undefined) counts.set(quality, (counts.get(quality) ?? 0) + 1);
    scans++;
    gap(time_ms);
  }
  gap(to_ms);
  const quality = Object.fromEntries(QUALITIES.map((name) => [name, counts.get(name) ?? 0]));
  return {
    scans,
    thinned_before: from_ms < thinned_before_ms ? new Date(thinned_before_ms).toISOString() : null,
    thinned_to_s,
    quality: quality as Record<Quality, number>,
    longest_gap_h: longest_ms / 3_600_000,
    missing_h: missing_ms / 3_600_000,
  };
}

const OF_STORE = ['soc', 'width_m', 'spread_ratio', 'heat_transfer_factor'];

function seriesOf(
  history: History,
  unit: UnitDefinition,
  from_ms: number,
  to_ms: number,
): ReportPoint[] {
  const names = ['state_of_charge', 'power_MW_el'].concat(
    unit.stores.flatMap(({ id, strings }) => [
      ...OF_STORE.map((name) => `${id}.${name}`),
      ...strings.map((string) => `${id}.${string.id}.flow_factor`),
    ]),
  );
  const { points } = history.estimates.series(unit.id, from_ms, to_ms, POINTS, names);
  return points.map((point): ReportPoint => {
    const number = (name: string) => {
      const value = point[name];
      return typeof value === 'number' ? value : null;
    };
    const stores = unit.stores.map(({ id, strings }) => [
      id,
      {
        soc: number(`${id}.soc`),
        width_m: number(`${id}.width_m`),
        spread_ratio: number(`${id}.spread_ratio`),
        heat_transfer_factor: number(`${id}.heat_transfer_factor`),
        flow_factors: Object.fromEntries(
          strings.map((string) => [string.id, number(`${id}.${string.id}.flow_factor`)]),
        ),
      },
    ]);
    return {
      time: point.time,
      state_of_charge: number('state_of_charge'),
      power_MW_el: number('power_MW_el'),
      stores: Object.fromEntries(stores),
    };
  });
}

const RUN_WORDS = {
  charge: 'end of a charge',
  stand: 'end of a rest',
  discharge: 'end of a discharge',
} as const;

/** Profiles at the times asked for, else at the ends of the last charge, rest and discharge. */
function profilesOf(
  history: History,
  unit: UnitDefinition,
  cycles: readonly CycleRecord[],
  { profiles_at_ms }: ReportAsk,
): ReportProfile[] {
  const ends = (['charge', 'stand', 'discharge'] as const).flatMap((kind) => {
    const last = cycles.filter((cycle) => cycle.kind === kind).at(-1);
    return last ? [{ time_ms: Date.parse(last.to), words: RUN_WORDS[kind] }] : [];
  });
  const wanted =
    profiles_at_ms.length > 0
      ? profiles_at_ms.map((time_ms) => ({ time_ms, words: 'as asked' }))
      : ends.sort((a, b) => a.time_ms - b.time_ms);
  return wanted.flatMap(({ time_ms, words }): ReportProfile[] => {
    const profile = history.profiles.near(unit.id, time_ms, NEAR_MS);
    if (profile === null) return [];
    const stores = Object.entries(profile.stores).map(([id, { x_m, mean_K, readings }]) => [
      id,
      {
        ...{ x_m, mean_K },
        readings: readings.map(({ verdict, ...reading }) => ({
          ...reading,
          rejected: verdict !== null,
        })),
      },
    ]);
    return [{ time: profile.time, words, stores: Object.fromEntries(stores) }];
  });
}

function sensorsOf(
  unit: UnitDefinition,
  store: StoreDefinition,
  latest: Estimate | null,
  events: readonly WatchEvent[],
): ReportSensor[] {
  const rejected = latest?.stores[store.id]?.sensors.rejected ?? [];
  return store.strings.flatMap((string) =>
    string.thermocouples.map(({ id, position_m, group }) => ({
      ...{ id, store: store.id, string: string.id, position_m, group },
      now: rejected.find((one) => one.id === id) ?? null,
      verdicts: verdictsOf(
        events.filter((event) => event.id === `${unit.id}/sensor_rejected/${id}`),
      ),
    })),
  );
}

/** Raised and returned in pairs; the last may stand. */
function verdictsOf(events: readonly WatchEvent[]): ReportSensor['verdicts'] {
  const found: { from: string; until: string | null; message: string }[] = [];
  for (const { transition, time, message } of events) {
    const open = found.at(-1);
    if (transition === 'raised') found.push({ from: time, until: null, message });
    else if (open !== undefined && open.until === null) open.until = time;
  }
  return found;
}

function figuresOf(
  history: History,
  unit: UnitDefinition,
  from_ms: number,
  to_ms: number,
): ReportAlarmFigures {
  const annunciations = history.alarms.annunciations(
    unit.id,
    'alarm',
    from_ms - TEN_MINUTES_MS,
    to_ms,
  );
  const figures = alarmFigures({ from_ms, to_ms, annunciations, standing: [] });
  return {
    annunciated: figures.annunciated,
    per_day: figures.per_day,
    most_in_10_min: figures.most_in_10_min,
    floods: figures.floods.length,
    share_in_flood: figures.share_in_flood,
    chattering: figures.chattering.map(({ id }) => id),
    most_frequent: figures.most_frequent.map(({ id, count }) => ({ id, count })),
  };
}

/** What `gatherReport` is to know of the thinning of a store, as of a time. */
export function thinning(
  { thin_after_days, thin_to_s }: StoreConfig,
  now_ms: number,
): Pick<ReportAsk, 'thinned_before_ms' | 'thinned_to_s'> {
  return { thinned_before_ms: now_ms - thin_after_days * DAY_MS, thinned_to_s: thin_to_s };
}
