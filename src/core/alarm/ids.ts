import type { UnitDefinition } from '../definitions.js';
import { EVENT_KINDS, type EventKind } from '../watch/event.js';

/** Id of an alarm taken apart: `UNIT/KIND/SUBJECT`. */
export interface AlarmId {
  readonly unit: string;
  readonly kind: EventKind;
  readonly subject: string;
}

/** null where the text is no id of any unit. */
export function readId(id: string): AlarmId | null {
  const [unit, kind, ...rest] = id.split('/');
  const subject = rest.join('/');
  if (!unit || !isKind(kind) || subject === '') return null;
  return { unit, kind, subject };
}

export function isKind(text: string | undefined): text is EventKind {
  return (EVENT_KINDS as readonly (string | undefined)[]).includes(text);
}

type Subjects = (unit: UnitDefinition, services: readonly string[]) => string[];

const UNIT: Subjects = ({ id }) => [id];
const STORES: Subjects = ({ stores }) => stores.map(({ id }) => id);
const STRINGS: Subjects = ({ stores }) =>
  stores.flatMap(({ id, strings }) => strings.map((string) => `${id}/${string.id}`));

/** What each kind can be raised of, as the watch raises it. */
const SUBJECTS: Readonly<Record<EventKind, Subjects>> = {
  outlet_near_limit: STORES,
  pressure_drop_near_limit: STORES,
  estimate_blind: UNIT,
  data_stale: UNIT,
  front_spread: STORES,
  sensor_rejected: ({ stores, channels }) => [
    ...stores.flatMap(({ id, strings }) => [
      id,
      ...strings.flatMap((string) => string.thermocouples.map((one) => one.id)),
    ]),
    ...channels.filter(({ role }) => role.kind === 'pressure_drop').map(({ id }) => id),
  ],
  front_view_disagrees: STRINGS,
  gas_temperature_off: ({ channels }) =>
    channels.filter(({ role }) => role.kind === 'gas_temperature').map(({ id }) => id),
  database_unreachable: (_, services) => [...services],
  disk_full: () => ['disk'],
  store_damaged: () => ['journal', 'history'],
  heat_transfer_low: STORES,
  string_flow_uneven: STRINGS,
  front_travel_off: STORES,
  standing_loss_high: STORES,
  valve_leaks: STORES,
  pressure_drop_high: STORES,
  plateau_off: STORES,
  gas_lost: UNIT,
  bed_settled: STORES,
  stores_mismatched: UNIT,
  energy_lost: UNIT,
};

/**
 * All that a kind of alarm or alert can be raised of in a unit: nothing else can be shelved or taken out
 * of service, so that what is held back is bounded by the plant and not by what is asked.
 *
 * @param services that the daemon watches beside its units, by the names they are raised under
 */
export function subjectsOf(
  unit: UnitDefinition,
  kind: EventKind,
  services: readonly string[],
): string[] {
  return SUBJECTS[kind](unit, services);
}

/**
 * Whether an entry of a list covers an alarm: a kind, `KIND/SUBJECT`, or a whole id with its unit.
 */
export function covers(entry: string, { unit, kind, subject }: AlarmId): boolean {
  return [kind, `${kind}/${subject}`, `${unit}/${kind}/${subject}`].includes(entry);
}
