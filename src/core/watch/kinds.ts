import type { EventKind, WatchEvent } from './event.js';

/**
 * Alarm or alert, and how urgent. After ISA-18.2 an alarm needs the operator to act in time. That is
 * one of the conditions watched here: an outlet close to its limit ends the discharge within the
 * hour, and the operator has to prepare the change-over or lower the power. The others inform those
 * who look after bed, sensors and network; missing data is the most urgent of them, because every
 * figure grows old with it while the plant itself runs on.
 */
export const KIND_CLASSES: Readonly<
  Record<
    EventKind,
    { readonly class: WatchEvent['class']; readonly priority: WatchEvent['priority'] }
  >
> = {
  outlet_near_limit: { class: 'alarm', priority: 'high' },
  data_stale: { class: 'alert', priority: 'high' },
  front_spread: { class: 'alert', priority: 'medium' },
  database_unreachable: { class: 'alert', priority: 'medium' },
  gas_temperature_off: { class: 'alert', priority: 'medium' },
  front_view_disagrees: { class: 'alert', priority: 'low' },
  sensor_rejected: { class: 'alert', priority: 'low' },
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
}

/** Puts an event together; numbers that are not finite become null. */
export function watchEvent(parts: EventParts): WatchEvent {
  const { unit, kind, subject, time_ms, ...rest } = parts;
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
  };
}
