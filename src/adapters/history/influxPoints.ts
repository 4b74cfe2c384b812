import type { IPoint } from 'influx';
import { ZERO_CELSIUS_K } from '../../core/units.js';
import type { CycleRecord } from '../../core/watch/cycleRecord.js';
import { cycleView } from '../../core/watch/cycleView.js';
import type { OutboxItem, Withdrawal } from './outbox.js';

/**
 * What rockhour writes to InfluxDB 1.x. All fields are floats but those marked (string); a field
 * without a value is left out. The timestamp is the source time in ms, and tags are ids of the
 * configuration, so that a point written twice overwrites itself.
 *
 * - `rockhour_unit`, tags `unit`: state_of_charge; mode, quality (string); revision
 * - `rockhour_store`, tags `unit`, `store`: soc, soc_sigma, stored_MWh_th, stored_sigma_MWh_th,
 *   energy_position_m, spread_ratio, heat_transfer_factor, heat_transfer_factor_sigma,
 *   outlet_degC, sensors_used, sensors_rejected; fronts_reason (string)
 * - `rockhour_front`, tags `unit`, `store`, `front` (1 = nearest to the charge inlet): position_m,
 *   position_sigma_m, width_m, width_sigma_m
 * - `rockhour_string`, tags `unit`, `store`, `string`: flow_factor, flow_factor_sigma, position_m,
 *   width_m; of the front view: view_position_m, view_position_sigma_m, view_width_m,
 *   view_width_sigma_m, view_disagreement
 * - `rockhour_sensor`, tags `unit`, `store`, `sensor`, only while rejected: verdict (string)
 * - `rockhour_dispatch`, tags `unit`, `power_MW`: hours_p90, hours_p50, hours_p10,
 *   energy_p90_MWh_el, energy_p50_MWh_el, energy_p10_MWh_el; ends_by (string)
 * - `rockhour_event`, tags `unit`, `kind`, `subject`, `transition`: value, threshold (the limit;
 *   `limit` is a word of its query language); class, priority,
 *   message (string)
 * - `rockhour_cycle`, at the end of a run, tags `unit`, `run` (charge, stand or discharge), and `store`
 *   where it is of a store: of the unit running_h, span_h, drawn_MWh_el, delivered_MWh_el,
 *   power_most_MW_el, flow_mean_kg_s, soc_from, soc_to, ambient_mean_degC, round_trip, raised (how
 *   many); incomplete (string); of a store soc_from, soc_to, stored_from_MWh_th, stored_to_MWh_th,
 *   stored_sigma_MWh_th, carried_MWh_th, lost_MWh_th, lost_sigma_MWh_th, outlet_from_degC,
 *   outlet_to_degC, hottest_degC, coldest_degC, heat_transfer_factor, heat_transfer_factor_sigma,
 *   thermocouples_rejected, and at a quarter, half and three quarters of the length width_25_m,
 *   spread_ratio_25, width_50_m and so on
 */
export function pointsOf(item: Exclude<OutboxItem, Withdrawal>): IPoint[] {
  const timestamp = new Date(item.time_ms);
  const point = (measurement: string, tags: Tags, fields: Fields): IPoint[] => {
    const known = Object.entries(fields).filter(([, value]) => isWritable(value));
    if (known.length === 0) return [];
    return [{ measurement, tags: written(tags), fields: Object.fromEntries(known), timestamp }];
  };
  if (item.kind === 'estimate') return estimatePoints(item.content, point);
  if (item.kind === 'event') {
    const { unit, kind, subject, transition, value, limit, priority, message } = item.content;
    const fields = { value, threshold: limit, class: item.content.class, priority, message };
    return point('rockhour_event', { unit, kind, subject, transition }, fields);
  }
  if (item.kind === 'cycle') return cyclePoints(item.content, point);
  return item.content.flatMap(({ power_MW, hours, energy_MWh_el: energy, ends_by }) =>
    point(
      'rockhour_dispatch',
      { unit: item.unit, power_MW: String(power_MW) },
      {
        ...{ hours_p90: hours.p90, hours_p50: hours.p50, hours_p10: hours.p10 },
        ...{ energy_p90_MWh_el: energy.p90, energy_p50_MWh_el: energy.p50 },
        ...{ energy_p10_MWh_el: energy.p10, ends_by },
      },
    ),
  );
}

/**
 * The statement that deletes what a unit's scans have brought in a span. A scan that is made again may
 * lie some milliseconds elsewhere, and a front or a verdict less is no point that another overwrites.
 * What was told (events, hours) stays.
 */
export function withdrawalOf({ unit, content }: Withdrawal): string {
  const [from, to] = [content.from, content.to].map((time) => `${Date.parse(time)}ms`);
  const name = unit.replace(/[\\']/g, '\\$&');
  return (
    'DELETE FROM /^rockhour_(unit|store|front|string|sensor|cycle)$/ ' +
    `WHERE "unit" = '${name}' AND time >= ${from} AND time <= ${to}`
  );
}

type Tags = Readonly<Record<string, string>>;
type Fields = Readonly<Record<string, number | string | null | undefined>>;
type MakePoint = (measurement: string, tags: Tags, fields: Fields) => IPoint[];
type Estimate = Extract<OutboxItem, { kind: 'estimate' }>['content'];

function estimatePoints(estimate: Estimate, point: MakePoint): IPoint[] {
  const { unit, state_of_charge, mode, quality, revision } = estimate;
  const points = point('rockhour_unit', { unit }, { state_of_charge, mode, quality, revision });
  for (const [id, store] of Object.entries(estimate.stores)) {
    const tags = { unit, store: id };
    const { fronts, strings, front_views, sensors, outlet_K, ...scalars } = store;
    points.push(
      ...point('rockhour_store', tags, {
        ...scalars,
        outlet_degC: outlet_K === null ? null : outlet_K - ZERO_CELSIUS_K,
        sensors_used: sensors.used,
        sensors_rejected: sensors.rejected.length,
      }),
      ...fronts.flatMap((front, i) =>
        point('rockhour_front', { ...tags, front: String(i + 1) }, { ...front }),
      ),
      ...strings.flatMap(({ id: string, ...fields }) => {
        const view = front_views.find((one) => one.id === string);
        return point('rockhour_string', { ...tags, string }, { ...fields, ...viewFields(view) });
      }),
      ...sensors.rejected.flatMap(({ id: sensor, verdict }) =>
        point('rockhour_sensor', { ...tags, sensor }, { verdict }),
      ),
    );
  }
  return points;
}

function cyclePoints(record: CycleRecord, point: MakePoint): IPoint[] {
  const view = cycleView(record);
  const { unit, kind, from, to } = view;
  const tags = { unit, run: kind };
  const of_unit = point('rockhour_cycle', tags, {
    running_h: view.running_h,
    span_h: (Date.parse(to) - Date.parse(from)) / 3_600_000,
    drawn_MWh_el: view.drawn_MWh_el,
    delivered_MWh_el: view.delivered_MWh_el,
    power_most_MW_el: view.power_most_MW_el,
    flow_mean_kg_s: view.flow_mean_kg_s,
    soc_from: view.soc_from,
    soc_to: view.soc_to,
    ambient_mean_degC: view.ambient_mean_degC,
    round_trip: view.round_trip,
    raised: view.raised.length,
    incomplete: view.incomplete.join(' ') || null,
  });
  const of_stores = Object.entries(view.stores).flatMap(([store, run]) => {
    const { widths, flow_factors: _, ...fields } = run;
    const placed = widths.flatMap(({ share, width_m, spread_ratio }) => {
      const percent = Math.round(100 * share);
      return [
        [`width_${percent}_m`, width_m],
        [`spread_ratio_${percent}`, spread_ratio],
      ];
    });
    return point(
      'rockhour_cycle',
      { ...tags, store },
      { ...fields, ...Object.fromEntries(placed) },
    );
  });
  return [...of_unit, ...of_stores];
}

function viewFields(view: Estimate['stores'][string]['front_views'][number] | undefined): Fields {
  return {
    view_position_m: view?.position_m,
    view_position_sigma_m: view?.position_sigma_m,
    view_width_m: view?.width_m,
    view_width_sigma_m: view?.width_sigma_m,
    view_disagreement: view?.disagreement,
  };
}

/** InfluxDB refuses a whole batch for a NaN or an infinity. */
function isWritable(value: unknown): boolean {
  return typeof value === 'number' ? Number.isFinite(value) : typeof value === 'string';
}

/** InfluxDB refuses an empty tag and a line break in one. */
function written(tags: Tags): Record<string, string> {
  return Object.fromEntries(
    Object.entries(tags)
      .map(([key, value]) => [key, value.replace(/\s+/g, ' ').trim()] as const)
      .filter(([, value]) => value !== ''),
  );
}
