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
const KEYS = ['id', 'action', 'who', 'hours', 'why'];
export const MOST_WHO = 64;
export const MOST_WHY = 200;
const ID_WANTED = 'the id of an alarm or alert, UNIT/KIND/SUBJECT';
const WHO_WANTED = `a name of 1 to ${MOST_WHO} characters`;
const WHY_WANTED = `the reason, 1 to ${MOST_WHY} characters`;

/**
 * Reads a command that came as JSON; the first thing wrong with it is told.
 *
 * @param most_h longest time on the shelf [h]
 */
export function readCommand(value: unknown, most_h: number): AlarmCommand | CommandFault {
  if (typeof value !== 'object' || value === null || Array.isArray(value))
    return wrong(null, value, 'an object {"id", "action", "who", "hours", "why"}');
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
  if (action !== 'shelve') {
    if (hours !== undefined && hours !== null)
      return wrong('hours', hours, 'nothing: only shelve takes hours');
    return { id, action, who, hours: null, why };
  }
  if (typeof hours !== 'number' || !(hours > 0 && hours <= most_h))
    return wrong('hours', hours, `a number above 0 and at most ${most_h}`);
  return { id, action, who, hours, why };
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

/** One line without control characters, trimmed; null where it is none. */
function lineOf(value: unknown, most: number): string | null {
  if (typeof value !== 'string') return null;
  const text = value.trim();
  return text.length <= most && !/\p{Cc}/u.test(text) ? text : null;
}

function wrong(field: string | null, value: unknown, expected: string): CommandFault {
  return { code: 'wrong_value', field, value: value === undefined ? null : value, expected };
}
