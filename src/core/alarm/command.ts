import type { AlarmEntry } from './entry.js';
import type { AlarmInput } from './step.js';

/** What a person, or the plant's own system in his name, may do to an alarm. */
export const ALARM_ACTIONS = [
  'acknowledge',
  'reset',
  'shelve',
  'unshelve',
  'out_of_service',
  'return_to_service',
] as const;
export type AlarmAction = (typeof ALARM_ACTIONS)[number];

export interface AlarmCommand {
  readonly id: string;
  readonly action: AlarmAction;
  readonly who: string;
  /** Only of `shelve`: for how long [h]. */
  readonly hours: number | null;
  readonly why: string;
  /** When the word was given, by whoever sends it [ms since 1970]; absent: not said. */
  readonly time_ms?: number;
}

/** Why a command is not followed: the field, what it says and what was expected. */
export interface CommandFault {
  readonly code: 'wrong_value' | 'unknown_event' | 'wrong_state';
  readonly field: string | null;
  readonly value: unknown;
  readonly expected: string;
}

/** Actions that hide an alarm: whoever does so says why. */
const WANTS_WHY: readonly AlarmAction[] = ['shelve', 'out_of_service'];
const KEYS = ['id', 'action', 'who', 'hours', 'why', 'time'];
/** A shelf of less would be over before anybody has turned away [h]. */
export const LEAST_SHELF_H = 1 / 60;
/** A word that has waited longer was about another moment [ms], and clocks may differ by so much. */
const OLDEST_MS = 300_000;
const AHEAD_MS = 60_000;
/** Characters that neither a name nor a reason may have. */
const UNFIT = /[\p{Cc}\p{Cs}\p{Zl}\p{Zp}\p{Bidi_Control}]/u;
const INSTANT = /^\d{4}-\d\d-\d\dT\d\d:\d\d(:\d\d(\.\d+)?)?(Z|[+-]\d\d:\d\d)$/;
export const MOST_WHO = 64;
export const MOST_WHY = 200;
const ID_WANTED = 'the id of an alarm or alert, UNIT/KIND/SUBJECT';
const WHO_WANTED = `a name of 1 to ${MOST_WHO} characters`;
const TIME_WANTED = 'when the word was given, ISO 8601 with its zone, such as 2026-01-31T06:00:00Z';
const WHY_WANTED = `the reason, 1 to ${MOST_WHY} characters`;

/**
 * Reads a command that came as JSON; the first thing wrong with it is told.
 *
 * @param most_h longest time on the shelf [h]
 */
export function readCommand(value: unknown, most_h: number): AlarmCommand | CommandFault {
  if (typeof value !== 'object' || value === null || Array.isArray(value))
    return wrong(null, value, 'an object {"id", "action", "who", "hours", "why", "time"}');
  const fields = value as Record<string, unknown>;
  const strange = Object.keys(fields).find((name) => !KEYS.includes(name));
  if (strange !== undefined) return wrong(strange, fields[strange], `one of ${KEYS.join(', ')}`);
  const { id, action, hours } = fields;
  if (typeof id !== 'string' || id === '' || id.length > 300) return wrong('id', id, ID_WANTED);
  if (!isAction(action)) return wrong('action', action, `one of ${ALARM_ACTIONS.join(', ')}`);
  const who = lineOf(fields.who, MOST_WHO);
  if (who === null || who === '') return wrong('who', fields.who, WHO_WANTED);
  const why = lineOf(fields.why ?? '', MOST_WHY);
  if (why === null || (why === '' && WANTS_WHY.includes(action)))
    return wrong('why', fields.why, WHY_WANTED);
  const time_ms = instantOf(fields.time);
  if (time_ms === null) return wrong('time', fields.time, TIME_WANTED);
  const given = time_ms === undefined ? {} : { time_ms };
  if (action !== 'shelve') {
    if (hours !== undefined && hours !== null)
      return wrong('hours', hours, 'nothing: only shelve takes hours');
    return { id, action, who, hours: null, why, ...given };
  }
  if (typeof hours !== 'number' || !(hours >= LEAST_SHELF_H && hours <= most_h))
    return wrong('hours', hours, `a number from 1/60 (a minute) to ${most_h}`);
  return { id, action, who, hours, why, ...given };
}

/**
 * What is wrong with the time of a command: a broker hands out after an outage what was sent long
 * before, when the alarm may have been another occurrence, which somebody saw, and not this one.
 *
 * @param entry of its alarm as it is now; null: it is normal
 * @returns null where nothing is wrong, or the command does not say when it was given
 */
export function staleFault(
  { action, time_ms }: AlarmCommand,
  entry: Pick<AlarmEntry, 'state' | 'since'> | null,
  now_ms: number,
): CommandFault | null {
  if (time_ms === undefined) return null;
  const value = new Date(time_ms).toISOString();
  const now = new Date(now_ms).toISOString();
  if (time_ms < now_ms - OLDEST_MS)
    return wrong('time', value, `a time at most 5 min before ${now}`);
  if (time_ms > now_ms + AHEAD_MS) return wrong('time', value, `a time at most 1 min after ${now}`);
  if (action !== 'acknowledge' || entry?.state !== 'unacknowledged') return null;
  if (Date.parse(entry.since) <= time_ms) return null;
  const expected = `a time after ${entry.since}, since when it is shown: what was seen before is not this`;
  return { code: 'wrong_state', field: 'time', value, expected };
}

export function isFault(read: AlarmCommand | CommandFault): read is CommandFault {
  return 'code' in read;
}

/** What the command is to the state machine, given at a time [ms since 1970]. */
export function inputOf({ action, who, why, hours }: AlarmCommand, time_ms: number): AlarmInput {
  switch (action) {
    case 'acknowledge':
      return { kind: 'acknowledged', who, why };
    case 'reset':
      return { kind: 'reset', who, why };
    case 'shelve':
      return { kind: 'shelved', who, why, until_ms: time_ms + (hours ?? 0) * 3_600_000 };
    case 'unshelve':
      return { kind: 'unshelved', who, why };
    case 'out_of_service':
      return { kind: 'removed', who, why };
    case 'return_to_service':
      return { kind: 'restored', who, why };
  }
}

function isAction(value: unknown): value is AlarmAction {
  return (ALARM_ACTIONS as readonly unknown[]).includes(value);
}

/**
 * One line, trimmed; null where it is none. Beside control characters no line or paragraph separator,
 * none that turns the direction of writing (a name could be made to read as another) and no half of a
 * pair is taken; and not what consists of invisible characters alone.
 */
function lineOf(value: unknown, most: number): string | null {
  if (typeof value !== 'string') return null;
  const text = value.trim();
  if (text.length > most || UNFIT.test(text)) return null;
  return text !== '' && /^[\p{Cf}\p{Z}]*$/u.test(text) ? null : text;
}

/** undefined: none is said; null: it is none. */
function instantOf(value: unknown): number | null | undefined {
  if (value === undefined || value === null) return undefined;
  if (typeof value !== 'string' || !INSTANT.test(value)) return null;
  const time_ms = Date.parse(value);
  return Number.isFinite(time_ms) ? time_ms : null;
}

function wrong(field: string | null, value: unknown, expected: string): CommandFault {
  return { code: 'wrong_value', field, value: value === undefined ? null : value, expected };
}
