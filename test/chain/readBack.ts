import { inflateSync } from 'node:zlib';
import Database from 'better-sqlite3';
import type { DispatchAnswer, Estimate, ProfileView } from '../../src/core/estimate.js';
import type { WatchEvent } from '../../src/core/watch/event.js';

/** Everything that a daemon's database has of a unit, by plain SQL. */
export interface Stored {
  readonly estimates: Estimate[];
  readonly profiles: ProfileView[];
  readonly dispatch: { readonly time_ms: number; readonly answers: DispatchAnswer[] }[];
  readonly events: WatchEvent[];
}

export function readSqlite(file: string, unit: string): Stored {
  const database = new Database(file, { readonly: true });
  try {
    const all = <T>(table: string): { time: number; content: T }[] => {
      const rows = database
        .prepare(`SELECT time, json FROM ${table} WHERE unit = ? ORDER BY time`)
        .all(unit) as { time: number; json: string | Buffer }[];
      return rows.map(({ time, json }) => {
        // Profiles are kept deflated.
        const text = typeof json === 'string' ? json : inflateSync(json).toString();
        return { time, content: JSON.parse(text) as T };
      });
    };
    return {
      estimates: all<Estimate>('estimates').map(({ content }) => content),
      profiles: all<ProfileView>('profiles').map(({ content }) => content),
      dispatch: all<DispatchAnswer[]>('dispatch').map(({ time, content }) => ({
        time_ms: time,
        answers: content,
      })),
      events: all<WatchEvent>('events').map(({ content }) => content),
    };
  } finally {
    database.close();
  }
}

export type InfluxRow = Readonly<Record<string, number | string>>;

/** Rows of a measurement as the query interface of InfluxDB 1.x gives them; no key where no value. */
export async function readInflux(
  url: string,
  measurement: string,
  unit: string,
): Promise<InfluxRow[]> {
  const query = `SELECT * FROM ${measurement} WHERE unit = '${unit}'`;
  const answer = await fetch(`${url}/query?db=rockhour&epoch=ms&q=${encodeURIComponent(query)}`);
  const body = (await answer.json()) as {
    results: { error?: string; series?: { columns: string[]; values: unknown[][] }[] }[];
  };
  const [result] = body.results;
  if (result?.error !== undefined) throw new Error(`${query}: ${result.error}`);
  return (result?.series ?? []).flatMap(({ columns, values }) =>
    values.map((row) => withoutNulls(Object.fromEntries(columns.map((name, i) => [name, row[i]])))),
  );
}

function withoutNulls(row: Readonly<Record<string, unknown>>): InfluxRow {
  const known = Object.entries(row).filter(([, value]) => value !== null && value !== undefined);
  return Object.fromEntries(known) as InfluxRow;
}

/**
 * What the database must hold of a unit, measurement by measurement: written down from the table
 * in README.md, not from the code that writes it.
 */
export function expectedInInflux(stored: Stored): Record<string, InfluxRow[]> {
  const { estimates, dispatch, events } = stored;
  const timed = (row: Readonly<Record<string, unknown>>, time: string) =>
    withoutNulls({ time: Date.parse(time), ...row });
  const perStore = estimates.flatMap(({ time, unit, stores }) =>
    Object.entries(stores).map(([store, content]) => ({ time, tags: { unit, store }, content })),
  );
  return {
    rockhour_unit: estimates.map(({ time, unit, state_of_charge, mode, quality, revision }) =>
      timed({ unit, state_of_charge, mode, quality, revision }, time),
    ),
    rockhour_store: perStore.map(({ time, tags, content }) => {
      const { fronts: _f, strings: _s, front_views: _v, sensors, outlet_K, ...numbers } = content;
      const counts = { sensors_used: sensors.used, sensors_rejected: sensors.rejected.length };
      const outlet_degC = outlet_K === null ? null : outlet_K - 273.15;
      return timed({ ...tags, ...numbers, ...counts, outlet_degC }, time);
    }),
    rockhour_front: perStore.flatMap(({ time, tags, content }) =>
      content.fronts.map((front, i) => timed({ ...tags, front: String(i + 1), ...front }, time)),
    ),
    rockhour_string: perStore.flatMap(({ time, tags, content }) =>
      content.strings.map(({ id, ...numbers }) => {
        const view = content.front_views.find((one) => one.id === id);
        return timed(
          {
            ...tags,
            string: id,
            ...numbers,
            view_position_m: view?.position_m,
            view_position_sigma_m: view?.position_sigma_m,
            view_width_m: view?.width_m,
            view_width_sigma_m: view?.width_sigma_m,
            view_disagreement: view?.disagreement,
          },
          time,
        );
      }),
    ),
    rockhour_sensor: perStore.flatMap(({ time, tags, content }) =>
      content.sensors.rejected.map(({ id, verdict }) =>
        timed({ ...tags, sensor: id, verdict }, time),
      ),
    ),
    rockhour_dispatch: dispatch.flatMap(({ time_ms, answers }) =>
      answers.map(({ power_MW, hours, energy_MWh_el: energy, ends_by }) => ({
        time: time_ms,
        unit: estimates[0]!.unit,
        power_MW: String(power_MW),
        hours_p90: hours.p90,
        hours_p50: hours.p50,
        hours_p10: hours.p10,
        energy_p90_MWh_el: energy.p90,
        energy_p50_MWh_el: energy.p50,
        energy_p10_MWh_el: energy.p10,
        ends_by,
      })),
    ),
    rockhour_event: events.map(({ id: _, time, limit, ...event }) =>
      timed({ ...event, threshold: limit }, time),
    ),
  };
}

/** Rows in an order of their own: of one time InfluxDB gives the tags in any. */
export function sorted(rows: readonly InfluxRow[]): InfluxRow[] {
  const keyOf = (row: InfluxRow) =>
    JSON.stringify(
      [
        'time',
        'store',
        'front',
        'string',
        'sensor',
        'power_MW',
        'kind',
        'subject',
        'transition',
      ].map((name) => row[name] ?? ''),
    );
  return [...rows].sort((a, b) => (keyOf(a) < keyOf(b) ? -1 : 1));
}
