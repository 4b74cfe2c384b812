import type { WatchEvent } from '../watch/event.js';
import { toldTime } from '../watch/messages.js';
import type { AlarmState } from './state.js';
import type { AlarmTransition, TransitionKind } from './step.js';

/** What let an alarm go that is shown again without having been raised anew. */
const AGAIN = {
  unshelved: 'it was taken off the shelf',
  shelf_ran_out: 'its time on the shelf ran out',
  released: 'the rule of the design that held it back has ended',
  returned_to_service: 'it was returned to service',
} as const satisfies Partial<Record<TransitionKind, string>>;
export type Again = keyof typeof AGAIN;

/** What receivers outside are told: an event, or that an alarm is shown again. */
export interface ToldEvent extends WatchEvent {
  /** Only of `raised`: shown again, and by what. `time` is when; absent: its condition came up. */
  readonly again?: Again;
  /** Only with `again`: when its condition came up. */
  readonly raised_at?: string;
}

/**
 * What is told outside of a step of an alarm, decided as it is made: what becomes of the alarm before
 * it is delivered changes nothing of it. Told is whatever is shown as unacknowledged anew, be it raised
 * or let go by shelf, rule or service; and every return of what was told as raised, be it held back by
 * then, or a receiver would hold it open for ever.
 *
 * @param before state before the step
 * @param event that brought the step about, else the one that raised the alarm last; null: none
 * @returns null where nothing is to be told
 */
export function tellingOf(
  before: AlarmState,
  transition: AlarmTransition | null,
  event: WatchEvent | null,
): ToldEvent | null {
  if (transition === null || event === null) return null;
  const { what, after, time_ms } = transition;
  if (what === 'returned') return before.told ? event : null;
  if (after !== 'unacknowledged' || before.state === 'unacknowledged') return null;
  if (!isAgain(what)) return event;
  return {
    ...event,
    ...{ transition: 'raised', time: new Date(time_ms).toISOString(), again: what },
    raised_at: event.time,
    message: `Shown again, as ${AGAIN[what]}; raised at ${toldTime(event.time)}: ${event.message}`,
  };
}

function isAgain(what: TransitionKind): what is Again {
  return Object.hasOwn(AGAIN, what);
}
