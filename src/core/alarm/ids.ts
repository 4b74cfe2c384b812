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

/**
 * Whether something of this unit goes by this name: the unit, a store, a string (alone or with its
 * store), a thermocouple, another channel.
 */
export function hasSubject({ id, stores, channels }: UnitDefinition, subject: string): boolean {
  if (subject === id || channels.some((channel) => channel.id === subject)) return true;
  return stores.some((store) => {
    if (subject === store.id) return true;
    return store.strings.some(
      (string) =>
        subject === string.id ||
        subject === `${store.id}/${string.id}` ||
        string.thermocouples.some((one) => one.id === subject),
    );
  });
}

/**
 * Whether an entry of a list covers an alarm: a kind, `KIND/SUBJECT`, or a whole id with its unit.
 */
export function covers(entry: string, { unit, kind, subject }: AlarmId): boolean {
  return [kind, `${kind}/${subject}`, `${unit}/${kind}/${subject}`].includes(entry);
}
