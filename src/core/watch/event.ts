/** Something that a person may want to know: raised, or returned to normal. */
export const EVENT_KINDS = [
  'front_spread',
  'sensor_rejected',
  'data_stale',
  'outlet_near_limit',
  'pressure_drop_near_limit',
  'estimate_blind',
  'front_view_disagrees',
  'gas_temperature_off',
  'database_unreachable',
  'disk_full',
  'store_damaged',
  'heat_transfer_low',
  'string_flow_uneven',
  'front_travel_off',
  'standing_loss_high',
  'valve_leaks',
  'pressure_drop_high',
  'plateau_off',
  'gas_lost',
  'bed_settled',
  'stores_mismatched',
  'energy_lost',
] as const;
export type EventKind = (typeof EVENT_KINDS)[number];

/** Raised by the daemon of itself and its services, not by a unit's estimator: no saved state has it. */
export function isOfTheMachine(kind: EventKind): boolean {
  return ['database_unreachable', 'disk_full', 'store_damaged'].includes(kind);
}

export interface WatchEvent {
  /** Stable over raise and return: `${unit}/${kind}/${subject}`. */
  readonly id: string;
  readonly unit: string;
  readonly kind: EventKind;
  /** An alarm needs the operator to act in time; an alert informs those it concerns (ISA-18.2). */
  readonly class: 'alarm' | 'alert';
  readonly priority: 'high' | 'medium' | 'low';
  /** Store, sensor or service that it concerns. */
  readonly subject: string;
  readonly transition: 'raised' | 'returned';
  /** ISO 8601 UTC, source time. */
  readonly time: string;
  readonly value: number | null;
  readonly limit: number | null;
  /** Until when the operator can act, ISO 8601 UTC; absent: not known, or nothing for him to do. */
  readonly act_by?: string | undefined;
  /** Plain sentence with the value and what it means. */
  readonly message: string;
}
