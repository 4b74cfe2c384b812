import type { IPoint } from 'influx';
import { ZERO_CELSIUS_K } from '../../core/units.js';
import type { OutboxItem } from './outbox.js';

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
 */
export function pointsOf(item: OutboxItem): IPoint[] {
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
