import { type AlarmState, type AlarmStateName, isHeldBack } from './state.js';

/** What can happen to an alarm. `time` only lets time pass. */
export type AlarmInput =
  | { readonly kind: 'raised' | 'returned' | 'suppressed' | 'released' | 'time' }
  | {
      readonly kind: 'acknowledged' | 'reset' | 'unshelved' | 'removed' | 'restored';
      readonly who: string;
      readonly why: string;
    }
  | {
      readonly kind: 'shelved';
      readonly who: string;
      readonly why: string;
      readonly until_ms: number;
    };

export const TRANSITION_KINDS = [
  'raised',
  'raised_again',
  'returned',
  'acknowledged',
  'reset',
  'shelved',
  'unshelved',
  'shelf_ran_out',
  'suppressed_by_design',
  'released',
  'out_of_service',
  'returned_to_service',
] as const;
export type TransitionKind = (typeof TRANSITION_KINDS)[number];

/** One arrow of the diagram, walked at a time by somebody for a reason. */
export interface AlarmTransition {
  readonly what: TransitionKind;
  readonly time_ms: number;
  readonly before: AlarmStateName;
  readonly after: AlarmStateName;
  /** null: the condition itself, a rule or the time. */
  readonly who: string | null;
  readonly why: string;
}

export interface AlarmStep {
  readonly state: AlarmState;
  /** null where nothing was worth recording. */
  readonly transition: AlarmTransition | null;
  /** Why a person's word changed nothing; null where it did. */
  readonly refused: string | null;
}

export interface AlarmTiming {
  readonly time_ms: number;
  /** It stays after its return until somebody has looked and resets it. */
  readonly latching: boolean;
}

/**
 * One step of the standard's diagram (ISA-18.2, IEC 62682):
 *
 *     A normal -raised-> B unacknowledged -acknowledged-> C acknowledged -returned-> A
 *     B -returned-> D returned, unacknowledged -acknowledged-> A, -raised-> B
 *     latching: B -returned-> E -acknowledged-> F, C -returned-> F, F -reset-> A, E and F -raised-> B
 *     any -shelved-> G, -suppressed-> H, -removed-> I; from there back to A, or to B where the
 *     condition stands: it is unacknowledged anew
 *
 * Decided here, where the diagram leaves it open: I outranks G and G outranks H, and what is outranked
 * by H's rule alone is remembered; what a rule took off the list unacknowledged comes back as D where
 * its condition has returned meanwhile, unless it was acknowledged in H; a latch that was not reset comes
 * back as E. A condition that comes or goes while held back is recorded, without a change of state.
 *
 * @param alarm is not changed
 * @throws RangeError for a time that is not finite, a shelf that ends before it begins, or nobody
 */
export function stepAlarm(alarm: AlarmState, input: AlarmInput, timing: AlarmTiming): AlarmStep {
  const { time_ms } = timing;
  if (!Number.isFinite(time_ms)) throw new RangeError(`time_ms must be finite, got ${time_ms}`);
  if ('who' in input && input.who.trim() === '')
    throw new RangeError('who must be the name of a person or system, got an empty text');
  switch (input.kind) {
    case 'raised':
      return raise(alarm, time_ms);
    case 'returned':
      return giveBack(alarm, timing);
    case 'acknowledged':
      return acknowledge(alarm, input, time_ms);
    case 'reset':
      return reset(alarm, input, time_ms);
    case 'shelved':
      return shelve(alarm, input, time_ms);
    case 'unshelved':
      if (alarm.shelf === null) return refuse(alarm, 'it is not shelved');
      return move({ ...alarm, shelf: null }, alarm, 'unshelved', time_ms, input);
    case 'time':
      if (alarm.shelf === null || alarm.shelf.until_ms > time_ms) return still(alarm);
      return move({ ...alarm, shelf: null }, alarm, 'shelf_ran_out', time_ms, RAN_OUT);
    case 'suppressed':
      return suppress(alarm, time_ms);
    case 'released':
      if (!alarm.suppressed) return still(alarm);
      if (isOutranked(alarm)) return still({ ...alarm, suppressed: false });
      return move({ ...alarm, suppressed: false }, alarm, 'released', time_ms, RULE_ENDED);
    case 'removed': {
      if (alarm.service !== null) return refuse(alarm, 'it is out of service already');
      const service = { who: input.who, why: input.why, since_ms: time_ms };
      const removed = { ...alarm, service, shelf: null, unseen: false };
      return move(removed, alarm, 'out_of_service', time_ms, input);
    }
    case 'restored':
      if (alarm.service === null) return refuse(alarm, 'it is not out of service');
      return move({ ...alarm, service: null }, alarm, 'returned_to_service', time_ms, input);
  }
}

interface By {
  readonly who: string | null;
  readonly why: string;
}
const ITSELF: By = { who: null, why: '' };
const RAN_OUT: By = { who: null, why: 'its time on the shelf ran out' };
const RULE: By = { who: null, why: 'a rule of the design holds' };
const RULE_ENDED: By = { who: null, why: 'the rule of the design has ended' };

function still(state: AlarmState): AlarmStep {
  return { state, transition: null, refused: null };
}

function refuse(state: AlarmState, refused: string): AlarmStep {
  return { state, transition: null, refused };
}

/** State that the flags stand for, once none of G, H and I holds it back: A, B, D or E. */
function shown({ active, latched, unseen }: AlarmState): AlarmStateName {
  if (active) return 'unacknowledged';
  if (latched) return 'latched_unacknowledged';
  return unseen ? 'returned_unacknowledged' : 'normal';
}

function heldBack({ service, shelf, suppressed }: AlarmState): AlarmStateName | null {
  if (service !== null) return 'out_of_service';
  if (shelf !== null) return 'shelved';
  return suppressed ? 'suppressed_by_design' : null;
}

/** A rule then changes nothing that could be seen. */
function isOutranked({ service, shelf }: AlarmState): boolean {
  return service !== null || shelf !== null;
}

/** Into the state that the flags of `next` stand for. */
function move(
  next: AlarmState,
  { state: before }: AlarmState,
  what: TransitionKind,
  time_ms: number,
  { who, why }: By,
): AlarmStep {
  const after = heldBack(next) ?? shown(next);
  const isShownAnew = after === 'unacknowledged';
  const state: AlarmState = {
    ...next,
    state: after,
    unseen: isHeldBack(after) && next.unseen,
    told: next.told || isShownAnew,
    latched: next.latched && after !== 'normal',
    since_ms: after === before ? next.since_ms : time_ms,
    raised_ms: isShownAnew ? time_ms : after === 'normal' ? null : next.raised_ms,
    acknowledged: isHeldBack(after) ? next.acknowledged : null,
  };
  return { state, transition: { what, time_ms, before, after, who, why }, refused: null };
}

/** Into a state that does not follow from the flags alone: C, D, E, F or A. */
function put(
  next: AlarmState,
  { state: before }: AlarmState,
  what: TransitionKind,
  time_ms: number,
  { who, why }: By,
): AlarmStep {
  const after = next.state;
  const ended = after === 'normal' ? { raised_ms: null, acknowledged: null, latched: false } : {};
  const state = { ...next, ...ended, since_ms: after === before ? next.since_ms : time_ms };
  return { state, transition: { what, time_ms, before, after, who, why }, refused: null };
}

function raise(alarm: AlarmState, time_ms: number): AlarmStep {
  if (alarm.active) return still(alarm);
  const what = alarm.state === 'normal' || isHeldBack(alarm.state) ? 'raised' : 'raised_again';
  return move({ ...alarm, active: true }, alarm, what, time_ms, ITSELF);
}

function giveBack(alarm: AlarmState, { time_ms, latching }: AlarmTiming): AlarmStep {
  if (!alarm.active) return still(alarm);
  const next = { ...alarm, active: false, told: false };
  const to = (state: AlarmStateName, latched = false) =>
    put({ ...next, state, latched }, alarm, 'returned', time_ms, ITSELF);
  if (isHeldBack(alarm.state)) return to(alarm.state, alarm.latched);
  if (alarm.state === 'acknowledged') {
    return latching ? to('latched_acknowledged', true) : to('normal');
  }
  return latching ? to('latched_unacknowledged', true) : to('returned_unacknowledged');
}

interface Who {
  readonly who: string;
}

function acknowledge(alarm: AlarmState, by: By & Who, time_ms: number): AlarmStep {
  const { who, why } = by;
  const acknowledged = { who, why, since_ms: time_ms };
  const to = (state: AlarmStateName) =>
    put({ ...alarm, state, acknowledged }, alarm, 'acknowledged', time_ms, by);
  switch (alarm.state) {
    case 'unacknowledged':
      return to('acknowledged');
    case 'returned_unacknowledged':
      return to('normal');
    case 'latched_unacknowledged':
      return to('latched_acknowledged');
    case 'suppressed_by_design':
      // Seen on the list of what is held back: it does not come back as returned.
      if (!alarm.unseen) return refuse(alarm, 'it is suppressed by design');
      return put({ ...alarm, unseen: false, acknowledged }, alarm, 'acknowledged', time_ms, by);
    case 'normal':
      return refuse(alarm, 'nothing of it is to be acknowledged');
    case 'acknowledged':
    case 'latched_acknowledged':
      return refuse(alarm, `it was acknowledged by ${alarm.acknowledged?.who ?? 'somebody'}`);
    default:
      return refuse(alarm, `it is ${alarm.state.replaceAll('_', ' ')}`);
  }
}

function reset(alarm: AlarmState, by: By & Who, time_ms: number): AlarmStep {
  if (alarm.state === 'latched_acknowledged') {
    return put({ ...alarm, state: 'normal' }, alarm, 'reset', time_ms, by);
  }
  if (alarm.state === 'latched_unacknowledged') return refuse(alarm, 'acknowledge it first');
  return refuse(alarm, alarm.active ? 'its condition still stands' : 'it is not latched');
}

function shelve(
  alarm: AlarmState,
  { who, why, until_ms }: By & Who & { readonly until_ms: number },
  time_ms: number,
): AlarmStep {
  if (!(until_ms > time_ms && Number.isFinite(until_ms)))
    throw new RangeError(`until_ms must be a finite time after ${time_ms}, got ${until_ms}`);
  if (alarm.service !== null) return refuse(alarm, 'it is out of service');
  const shelf = { who, why, since_ms: time_ms, until_ms };
  return move({ ...alarm, shelf, unseen: false }, alarm, 'shelved', time_ms, { who, why });
}

function suppress(alarm: AlarmState, time_ms: number): AlarmStep {
  if (alarm.suppressed) return still(alarm);
  const next = { ...alarm, suppressed: true };
  if (isOutranked(alarm)) return still(next);
  const unseen = ['unacknowledged', 'returned_unacknowledged'].includes(alarm.state);
  return move({ ...next, unseen }, alarm, 'suppressed_by_design', time_ms, RULE);
}
