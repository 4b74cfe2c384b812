import type { SensorVerdict } from '../../../core/estimate.js';
import type { EstimateState, Profile, StoreDefinition, StoreProfile } from '../lib/wire.js';
import type { SensorWorth } from './wire.js';

/** A thermocouple with all that is told of it. */
export interface SensorRow {
  readonly id: string;
  readonly store: string;
  readonly string: string;
  readonly position_m: number;
  readonly value_degC: number | null;
  /** Reading less the estimate of the same string at the same height [K]. */
  readonly apart_K: number | null;
  /** The same over the sigma of the estimate there. */
  readonly sigma_K: number | null;
  readonly verdict: SensorVerdict | null;
  readonly since: string | null;
  readonly evidence: string;
  /** Sigma of the store's charge without it, over that with it, less 1 (of its repair: the other way round). */
  readonly rise: number | null;
  /** The rise is that of its repair, since it is out of use. */
  readonly repair: boolean;
}

/** Between two cells in proportion, at the ends the value of the end cell. */
function valueAt(x_m: readonly number[], values: readonly number[], at_m: number): number | null {
  if (values.length === 0) return null;
  const next = x_m.findIndex((x) => x >= at_m);
  if (next <= 0) return values[next === 0 ? 0 : values.length - 1] ?? null;
  const [a, b] = [x_m[next - 1]!, x_m[next]!];
  const share = (at_m - a) / (b - a);
  return values[next - 1]! * (1 - share) + values[next]! * share;
}

/** All thermocouples of a unit, in the order of its definition. */
export function sensorRows(
  stores: readonly StoreDefinition[],
  profile: Profile | null,
  estimate: EstimateState | null,
  worth: SensorWorth | null,
): SensorRow[] {
  return stores.flatMap((store) =>
    store.strings.flatMap((string) =>
      string.thermocouples.map(({ id, position_m }): SensorRow => {
        const own = profile?.stores[store.id];
        const reading = own?.readings.find((one) => one.id === id);
        const rejected = estimate?.stores[store.id]?.sensors.rejected.find((one) => one.id === id);
        const known = worth?.stores
          .find((one) => one.store === store.id)
          ?.sensors.find((one) => one.id === id);
        const value_degC = reading?.value_degC ?? null;
        const { temperature, sigma } = estimateAt(own, string.id, position_m);
        return {
          ...{ id, store: store.id, string: string.id, position_m, value_degC },
          apart_K: value_degC === null || temperature === null ? null : value_degC - temperature,
          sigma_K: sigma,
          verdict: rejected?.verdict ?? reading?.verdict ?? null,
          since: rejected?.since ?? null,
          evidence: rejected?.evidence ?? '',
          rise: known?.rise ?? null,
          repair: known?.in_use === false,
        };
      }),
    ),
  );
}

function estimateAt(profile: StoreProfile | undefined, string: string, at_m: number) {
  const tube = profile?.tubes.find((one) => one.id === string);
  if (profile === undefined || tube === undefined) return { temperature: null, sigma: null };
  return {
    temperature: valueAt(profile.x_m, tube.temperature_degC, at_m),
    sigma: valueAt(profile.x_m, tube.sigma_K, at_m),
  };
}

export const SORTS = ['id', 'place', 'reading', 'apart', 'verdict', 'worth'] as const;
export type SortKey = (typeof SORTS)[number];

export interface Sort {
  readonly by: SortKey;
  readonly down: boolean;
}

const KEYS: Readonly<Record<SortKey, (row: SensorRow) => number | string | null>> = {
  id: ({ id }) => id,
  place: ({ position_m }) => position_m,
  reading: ({ value_degC }) => value_degC,
  apart: ({ apart_K }) => (apart_K === null ? null : Math.abs(apart_K)),
  verdict: ({ verdict, since }) => (verdict === null ? null : (since ?? verdict)),
  worth: ({ rise }) => rise,
};

/** What is not known stands last, whichever way it is sorted. */
export function sorted(rows: readonly SensorRow[], { by, down }: Sort): SensorRow[] {
  const key = KEYS[by];
  const way = down ? -1 : 1;
  return [...rows].sort((a, b) => {
    const [p, q] = [key(a), key(b)];
    if (p === null || q === null) return Number(p === null) - Number(q === null);
    if (typeof p === 'number' && typeof q === 'number') return way * (p - q);
    return way * String(p).localeCompare(String(q), 'en', { numeric: true });
  });
}

/** `all`, `rejected` (and missing), or the id of a store. */
export function filtered(rows: readonly SensorRow[], filter: string): SensorRow[] {
  if (filter === 'all') return [...rows];
  if (filter === 'rejected') {
    return rows.filter(({ verdict, value_degC }) => verdict !== null || value_degC === null);
  }
  return rows.filter(({ store }) => `store ${store}` === filter);
}
