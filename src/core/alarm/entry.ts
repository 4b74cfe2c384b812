import { ALARM_TEXTS, type AlarmText } from '../watch/alarmTexts.js';
import type { EventKind, WatchEvent } from '../watch/event.js';
import { KIND_CLASSES } from '../watch/kinds.js';
import type { AlarmId } from './ids.js';
import { type AlarmState, type AlarmStateName, STATE_LETTERS } from './state.js';
import type { TransitionKind } from './step.js';

/** An alarm or alert with its state, as it is listed. Times are ISO 8601 UTC. */
export interface AlarmEntry extends Omit<WatchEvent, 'transition'>, AlarmText {
  /** Time within which acting still helps [h]: what the event tells, else what is usual. */
  readonly respond_within_h: number;
  readonly state: AlarmStateName;
  /** Letter of the standard's diagram. */
  readonly letter: string;
  /** The condition stands, be it shown or held back. */
  readonly active: boolean;
  /** In this state since. */
  readonly since: string;
  readonly acknowledged_by: string | null;
  readonly shelved: { readonly by: string; readonly why: string; readonly until: string } | null;
  readonly out_of_service: { readonly by: string; readonly why: string } | null;
}

/** One recorded transition. `before` and `after` are null where an older version kept none. */
export interface RecordedTransition {
  readonly id: string;
  readonly unit: string;
  readonly kind: EventKind;
  readonly time: string;
  readonly what: TransitionKind;
  readonly before: AlarmStateName | null;
  readonly after: AlarmStateName | null;
  readonly who: string | null;
  readonly why: string;
}

const iso = (ms: number | null) => new Date(ms ?? 0).toISOString();

const hoursBetween = (from: string, to: string) =>
  Math.max(0, (Date.parse(to) - Date.parse(from)) / 3.6e6);

/** @param event that raised it last; null where it was held back before it was ever raised */
export function entryOf(id: AlarmId, alarm: AlarmState, event: WatchEvent | null): AlarmEntry {
  const { shelf, service } = alarm;
  const { transition: _, ...told } = event ?? unraised(id, alarm);
  return {
    ...told,
    ...ALARM_TEXTS[id.kind],
    ...(event?.act_by === undefined
      ? {}
      : { respond_within_h: hoursBetween(event.time, event.act_by) }),
    state: alarm.state,
    letter: STATE_LETTERS[alarm.state],
    active: alarm.active,
    since: iso(alarm.since_ms),
    acknowledged_by: alarm.acknowledged?.who ?? null,
    shelved: shelf && { by: shelf.who, why: shelf.why, until: iso(shelf.until_ms) },
    out_of_service: service && { by: service.who, why: service.why },
  };
}

function unraised({ unit, kind, subject }: AlarmId, { since_ms }: AlarmState): WatchEvent {
  return {
    ...{ id: `${unit}/${kind}/${subject}`, unit, kind, ...KIND_CLASSES[kind], subject },
    ...{ transition: 'returned', time: iso(since_ms), value: null, limit: null },
    message: 'Not raised since it is held back.',
  };
}

const STATE_ORDER: readonly AlarmStateName[] = [
  'unacknowledged',
  'latched_unacknowledged',
  'returned_unacknowledged',
  'acknowledged',
  'latched_acknowledged',
];
const PRIORITY_ORDER = ['high', 'medium', 'low'];

/** What asks for an answer first: open before acknowledged, alarms before alerts, by priority, newest. */
export function inOrder(entries: readonly AlarmEntry[]): AlarmEntry[] {
  const rank = (entry: AlarmEntry) => [
    STATE_ORDER.indexOf(entry.state),
    entry.class === 'alarm' ? 0 : 1,
    PRIORITY_ORDER.indexOf(entry.priority),
  ];
  return [...entries].sort((a, b) => {
    const [x, y] = [rank(a), rank(b)];
    const first = x.findIndex((value, i) => value !== y[i]);
    if (first >= 0) return (x[first] as number) - (y[first] as number);
    return b.time.localeCompare(a.time) || a.id.localeCompare(b.id);
  });
}
