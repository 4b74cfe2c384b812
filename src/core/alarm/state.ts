/**
 * States of one alarm or alert after ANSI/ISA-18.2 and IEC 62682: the alarm state transition diagram
 * of the standard. Names and letters of the states are the standard's; the number of the clause is
 * not given, as the text itself was not at hand (states, letters and latching are as publicly
 * documented, the rest from memory; what is our own decision says so in step.ts).
 */
export const ALARM_STATES = [
  'normal',
  'unacknowledged',
  'acknowledged',
  'returned_unacknowledged',
  'latched_unacknowledged',
  'latched_acknowledged',
  'shelved',
  'suppressed_by_design',
  'out_of_service',
] as const;
export type AlarmStateName = (typeof ALARM_STATES)[number];

/** Letters of the standard's diagram. */
export const STATE_LETTERS: Readonly<Record<AlarmStateName, string>> = {
  normal: 'A',
  unacknowledged: 'B',
  acknowledged: 'C',
  returned_unacknowledged: 'D',
  latched_unacknowledged: 'E',
  latched_acknowledged: 'F',
  shelved: 'G',
  suppressed_by_design: 'H',
  out_of_service: 'I',
};

/** States in which the alarm is not shown to the operator. */
export const HELD_BACK = ['shelved', 'suppressed_by_design', 'out_of_service'] as const;
export type HeldBack = (typeof HELD_BACK)[number];

export function isHeldBack(state: AlarmStateName): state is HeldBack {
  return (HELD_BACK as readonly string[]).includes(state);
}

/** Who did it and why. */
export interface Word {
  readonly who: string;
  readonly why: string;
  readonly since_ms: number;
}

/** Plain, so that it can be stored. Times are ms since 1970. */
export interface AlarmState {
  readonly state: AlarmStateName;
  /** The condition stands, whether shown or held back. */
  readonly active: boolean;
  /** A latching alarm was shown and has not been reset since. */
  readonly latched: boolean;
  /** A rule took it off the list before anybody had acknowledged it. */
  readonly unseen: boolean;
  /** A rule of the design holds it back now, be it behind a shelf or out of service. */
  readonly suppressed: boolean;
  /** It was shown as unacknowledged, which is told outside, and its condition has not returned since. */
  readonly told: boolean;
  /** When it was last shown as unacknowledged; null where it never was since normal. */
  readonly raised_ms: number | null;
  /** When it came into its state; null before the first transition. */
  readonly since_ms: number | null;
  readonly acknowledged: Word | null;
  readonly shelf: (Word & { readonly until_ms: number }) | null;
  readonly service: Word | null;
}

export const NORMAL: AlarmState = {
  state: 'normal',
  active: false,
  latched: false,
  unseen: false,
  suppressed: false,
  told: false,
  raised_ms: null,
  since_ms: null,
  acknowledged: null,
  shelf: null,
  service: null,
};

/** True where nothing of it needs to be remembered: a rule that holds is found anew. */
export function isForgettable({ state, active, latched, unseen }: AlarmState): boolean {
  if (state === 'normal') return true;
  return state === 'suppressed_by_design' && !active && !latched && !unseen;
}
