import type { Mode } from '../../definitions.js';
import type { ToldEnd } from '../runEnd.js';
import type { CycleScan } from './cycleScan.js';
import type { Ends } from './ends.js';
import { type AtPlace, nearer, PLACES, passPlaces } from './places.js';

/** What counts of a stretch only while the unit does one thing. */
interface ModeSums {
  seconds: number;
  /** Integral of the flow's size [kg], and time over which it was known [s]. */
  flow_kg: number;
  flow_s: number;
  readonly outlets: ({ readonly from_K: number; readonly to_K: number } | null)[];
  readonly places: (AtPlace | null)[][];
  /** Energy-equivalent positions at the last scan in this mode [m]. */
  positions_m: readonly number[] | null;
}

interface StoreSums {
  carried_MWh: number;
  hottest_K: number;
  coldest_K: number;
}

/** Sums over a stretch of time that is, or may become, a run. Plain and bounded. */
export interface Stretch {
  readonly start: Ends;
  end: Ends;
  drawn_MWh: number;
  delivered_MWh: number;
  /** Greatest size of the net power [MW]; -1 before one was read. */
  power_most_MW: number;
  power_unknown_s: number;
  flow_unknown_s: number;
  /** Gas flowed at some time. */
  flowed: boolean;
  /** Readings were missing for too long. */
  gap: boolean;
  ambient_Ks: number;
  seconds: number;
  raised: string[];
  /** Of the end of its discharge, as it was first told, moved to its power; states before it lack it. */
  told?: ToldEnd;
  readonly stores: StoreSums[];
  readonly modes: Partial<Record<Mode, ModeSums>>;
}

export function startStretch(start: Ends): Stretch {
  return {
    start,
    end: start,
    ...{ drawn_MWh: 0, delivered_MWh: 0, power_most_MW: -1 },
    ...{ power_unknown_s: 0, flow_unknown_s: 0, flowed: false, gap: false },
    ...{ ambient_Ks: 0, seconds: 0, raised: [] },
    stores: start.stores.map(() => ({
      carried_MWh: 0,
      hottest_K: Number.NEGATIVE_INFINITY,
      coldest_K: Number.POSITIVE_INFINITY,
    })),
    modes: {},
  };
}

/** What a scan's values stand for over some time: power held where it is not read. */
export interface Rates {
  readonly mode: Mode;
  readonly power_MW: number;
  readonly flow_kg_s: number;
  readonly flowKnown: boolean;
  readonly ambient_K: number;
  readonly carried_MW: readonly number[];
}

/** Adds `hours` at these rates: trapezoids add up from the halves on either side of each scan. */
export function addRates(stretch: Stretch, rates: Rates, hours: number): void {
  const { power_MW, flow_kg_s } = rates;
  const seconds = 3600 * hours;
  if (Number.isFinite(power_MW)) {
    stretch.drawn_MWh += Math.max(0, power_MW) * hours;
    stretch.delivered_MWh += Math.max(0, -power_MW) * hours;
    stretch.power_most_MW = Math.max(stretch.power_most_MW, Math.abs(power_MW));
  } else stretch.power_unknown_s += seconds;
  const known = rates.flowKnown && rates.carried_MW.every(Number.isFinite);
  if (known) {
    rates.carried_MW.forEach((carried, s) => {
      (stretch.stores[s] as StoreSums).carried_MWh += carried * hours;
    });
    stretch.flowed ||= flow_kg_s !== 0;
  } else stretch.flow_unknown_s += seconds;
  stretch.ambient_Ks += rates.ambient_K * seconds;
  stretch.seconds += seconds;
  const own = modeSums(stretch, rates.mode);
  own.seconds += seconds;
  if (!known) return;
  own.flow_kg += Math.abs(flow_kg_s) * seconds;
  own.flow_s += seconds;
}

/** Takes alarms and alerts in, each once. */
export function noteRaised(stretch: Stretch, raised: readonly string[]): void {
  for (const id of raised) if (!stretch.raised.includes(id)) stretch.raised.push(id);
}

/** What was told anew after an alarm is no promise of the run: the first counts, at its newest power. */
function noteTold(stretch: Stretch, told: ToldEnd | null | undefined): void {
  if (told && (stretch.told === undefined || stretch.told.made_ms === told.made_ms))
    stretch.told = told;
}

/** Takes what one scan shows in itself. */
export function addScan(stretch: Stretch, scan: CycleScan, end: Ends): void {
  stretch.end = end;
  noteRaised(stretch, scan.raised);
  noteTold(stretch, scan.told);
  const own = modeSums(stretch, scan.mode);
  scan.stores.forEach((store, s) => {
    const sums = stretch.stores[s] as StoreSums;
    sums.hottest_K = Math.max(sums.hottest_K, store.hottest_K);
    sums.coldest_K = Math.min(sums.coldest_K, store.coldest_K);
    if (store.outlet_K !== null)
      own.outlets[s] = {
        from_K: own.outlets[s]?.from_K ?? store.outlet_K,
        to_K: store.outlet_K,
      };
    passPlaces(own.places[s] as (AtPlace | null)[], own.positions_m?.[s] ?? null, store);
  });
  own.positions_m = scan.stores.map(({ position_m }) => position_m);
}

/** Puts the stretch that follows into the one before it. */
export function merge(stretch: Stretch, next: Stretch): void {
  stretch.end = next.end;
  for (const key of ADDED) stretch[key] += next[key];
  stretch.power_most_MW = Math.max(stretch.power_most_MW, next.power_most_MW);
  stretch.flowed ||= next.flowed;
  stretch.gap ||= next.gap;
  noteRaised(stretch, next.raised);
  noteTold(stretch, next.told);
  stretch.stores.forEach((sums, s) => {
    const other = next.stores[s] as StoreSums;
    sums.carried_MWh += other.carried_MWh;
    sums.hottest_K = Math.max(sums.hottest_K, other.hottest_K);
    sums.coldest_K = Math.min(sums.coldest_K, other.coldest_K);
  });
  for (const [mode, sums] of Object.entries(next.modes)) {
    mergeMode(modeSums(stretch, mode as Mode), sums);
  }
}

const ADDED = [
  ...(['drawn_MWh', 'delivered_MWh', 'power_unknown_s', 'flow_unknown_s'] as const),
  ...(['ambient_Ks', 'seconds'] as const),
];

function mergeMode(own: ModeSums, next: ModeSums): void {
  own.seconds += next.seconds;
  own.flow_kg += next.flow_kg;
  own.flow_s += next.flow_s;
  own.positions_m = next.positions_m ?? own.positions_m;
  next.outlets.forEach((outlet, s) => {
    if (outlet) own.outlets[s] = { ...outlet, from_K: own.outlets[s]?.from_K ?? outlet.from_K };
  });
  next.places.forEach((seen, s) => {
    const places = own.places[s] as (AtPlace | null)[];
    seen.forEach((at, i) => {
      places[i] = nearer(places[i] ?? null, at);
    });
  });
}

function modeSums(stretch: Stretch, mode: Mode): ModeSums {
  stretch.modes[mode] ??= {
    ...{ seconds: 0, flow_kg: 0, flow_s: 0, positions_m: null },
    outlets: stretch.stores.map(() => null),
    places: stretch.stores.map(() => PLACES.map(() => null)),
  };
  return stretch.modes[mode];
}
