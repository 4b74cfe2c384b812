import type { EventKind, WatchEvent } from './event.js';
import type { IndicatorKind } from './indicator.js';

/**
 * Alarm or alert, and how urgent. After ISA-18.2 an alarm needs the operator to act in time. Three of
 * the plant's conditions watched here do: a discharge that ends within the hour and earlier than was told has
 * to be answered by power or by a change-over (one that ends as told asks for nothing); a pressure
 * drop close to its limit trips the machine at the next rise of flow; and a discharge that runs on an estimate which has lost its readings runs into its outlet limit unannounced, so that the
 * operator has to take the control system's outlets for a guide now. A fourth is of the machine that
 * rockhour runs on: with a full disk no reading is taken in, and within the hour a broker that keeps
 * little begins to lose them. The others inform those who look
 * after bed, sensors and network; missing data is the most urgent of them. While charging or standing
 * it costs nothing within the hour, so it is no alarm there.
 */
export const KIND_CLASSES: Readonly<
  Record<
    EventKind,
    { readonly class: WatchEvent['class']; readonly priority: WatchEvent['priority'] }
  >
> = {
  outlet_near_limit: { class: 'alarm', priority: 'high' },
  pressure_drop_near_limit: { class: 'alarm', priority: 'high' },
  estimate_blind: { class: 'alarm', priority: 'medium' },
  disk_full: { class: 'alarm', priority: 'medium' },
  data_stale: { class: 'alert', priority: 'high' },
  store_damaged: { class: 'alert', priority: 'high' },
  front_spread: { class: 'alert', priority: 'medium' },
  database_unreachable: { class: 'alert', priority: 'medium' },
  gas_temperature_off: { class: 'alert', priority: 'medium' },
  front_view_disagrees: { class: 'alert', priority: 'low' },
  sensor_rejected: { class: 'alert', priority: 'low' },
  heat_transfer_low: { class: 'alert', priority: 'medium' },
  string_flow_uneven: { class: 'alert', priority: 'medium' },
  front_travel_off: { class: 'alert', priority: 'medium' },
  standing_loss_high: { class: 'alert', priority: 'medium' },
  valve_leaks: { class: 'alert', priority: 'medium' },
  pressure_drop_high: { class: 'alert', priority: 'medium' },
  plateau_off: { class: 'alert', priority: 'medium' },
  gas_lost: { class: 'alert', priority: 'medium' },
  bed_settled: { class: 'alert', priority: 'medium' },
  stores_mismatched: { class: 'alert', priority: 'low' },
  energy_lost: { class: 'alert', priority: 'medium' },
};

/** Event that a degraded indicator raises; the others are watched on their own. */
export const INDICATOR_EVENTS: Readonly<Partial<Record<IndicatorKind, EventKind>>> = {
  spread_ratio: 'front_spread',
  heat_transfer: 'heat_transfer_low',
  string_flow: 'string_flow_uneven',
  front_travel: 'front_travel_off',
  standing_loss: 'standing_loss_high',
  valve_leak: 'valve_leaks',
  pressure_drop: 'pressure_drop_high',
  plateau: 'plateau_off',
  gas_inventory: 'gas_lost',
  settling: 'bed_settled',
  store_mismatch: 'stores_mismatched',
  front_view: 'front_view_disagrees',
  energy_lost: 'energy_lost',
};

export interface EventParts {
  readonly unit: string;
  readonly kind: EventKind;
  readonly subject: string;
  readonly transition: WatchEvent['transition'];
  readonly time_ms: number;
  readonly value: number | null;
  readonly limit: number | null;
  readonly message: string;
  /** Where the state makes it another than that of the kind. */
  readonly priority?: WatchEvent['priority'];
  /** Until when the operator can act [ms]. */
  readonly act_by_ms?: number;
}

/** Puts an event together; numbers that are not finite become null. */
export function watchEvent(parts: EventParts): WatchEvent {
  const { unit, kind, subject, time_ms, act_by_ms, ...rest } = parts;
  const finite = (value: number | null) =>
    value !== null && Number.isFinite(value) ? value : null;
  return {
    id: `${unit}/${kind}/${subject}`,
    unit,
    kind,
    ...KIND_CLASSES[kind],
    subject,
    ...rest,
    value: finite(parts.value),
    limit: finite(parts.limit),
    time: new Date(time_ms).toISOString(),
    ...(act_by_ms === undefined ? {} : { act_by: new Date(act_by_ms).toISOString() }),
  };
}
