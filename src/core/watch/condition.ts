/**
 * Life cycle of one condition (alarm or alert) in source time, after ISA-18.2 / IEC 62682: raised
 * once the evidence for it has lasted `on_delay_s`, returned to normal once the evidence against it
 * has lasted `off_delay_s`. Acknowledging is the daemon's part.
 */

/** `between`: inside the deadband; `unknown`: nothing can be said now. */
export type Evidence = 'active' | 'clear' | 'between' | 'unknown';
export type Transition = 'raised' | 'returned';

/** Plain, so that it can be saved and restored. */
export interface ConditionState {
  raised: boolean;
  /** Source time since which the evidence speaks for a change [ms], null while it does not. */
  pending_ms: number | null;
  /** Source time of the last step [ms], null before the first. */
  last_ms: number | null;
}

export interface ConditionTiming {
  readonly time_ms: number;
  readonly on_delay_s: number;
  readonly off_delay_s: number;
  /** Nothing is known of a gap longer than this: a delay starts afresh after it. Default: no limit. */
  readonly gap_s?: number;
}

export interface ConditionInput extends ConditionTiming {
  /** null: unknown now. */
  readonly value: number | null;
  readonly limit: number;
  /** How far back from the limit the value must go to return, >= 0. */
  readonly deadband: number;
  /** Which side of the limit is the condition. Default `above`. */
  readonly sense?: 'above' | 'below';
}

export function startCondition(): ConditionState {
  return { raised: false, pending_ms: null, last_ms: null };
}

/** True where nothing of the state needs to be remembered. */
export function isIdle(state: ConditionState): boolean {
  return !state.raised && state.pending_ms === null;
}

/**
 * One step on given evidence.
 *
 * Evidence must be unbroken for the delay: `between` and the opposite start it afresh. `unknown` says
 * nothing: it neither raises nor returns, and a delay that is running goes on, to be decided by the
 * next evidence. A delay of 0 acts at once.
 *
 * @param state changed in place
 * @throws RangeError for a time before the last one, or a delay that is negative or not finite
 */
export function stepEvidence(
  state: ConditionState,
  evidence: Evidence,
  timing: ConditionTiming,
): Transition | null {
  const { time_ms } = timing;
  if (!Number.isFinite(time_ms) || (state.last_ms !== null && time_ms < state.last_ms))
    throw new RangeError(`time_ms ${time_ms} is before the last step's ${state.last_ms}`);
  const delay_s = state.raised ? timing.off_delay_s : timing.on_delay_s;
  if (!(delay_s >= 0 && delay_s < Number.POSITIVE_INFINITY))
    throw new RangeError(
      `${state.raised ? 'off_delay_s' : 'on_delay_s'} must be a finite number of at least 0, got ${delay_s}`,
    );
  const gap_s = timing.gap_s ?? Number.POSITIVE_INFINITY;
  if (state.last_ms !== null && time_ms - state.last_ms > 1000 * gap_s) state.pending_ms = null;
  state.last_ms = time_ms;
  if (evidence === 'unknown') return null;
  if (evidence !== (state.raised ? 'clear' : 'active')) {
    state.pending_ms = null;
    return null;
  }
  state.pending_ms ??= time_ms;
  if (time_ms - state.pending_ms < 1000 * delay_s) return null;
  state.pending_ms = null;
  state.raised = !state.raised;
  return state.raised ? 'raised' : 'returned';
}

/**
 * One step on a value against a limit: beyond the limit the evidence is `active`, back by at least
 * the deadband it is `clear`, else `between`; a value that is null or not a number is `unknown`.
 *
 * @throws RangeError for a limit that is not finite or a negative deadband, and as `stepEvidence`
 */
export function stepCondition(state: ConditionState, input: ConditionInput): Transition | null {
  return stepEvidence(state, evidenceOf(input), input);
}

export function evidenceOf({
  value,
  limit,
  deadband,
  sense,
}: Pick<ConditionInput, 'value' | 'limit' | 'deadband' | 'sense'>): Evidence {
  if (!Number.isFinite(limit)) throw new RangeError(`limit must be a finite number, got ${limit}`);
  if (!(deadband >= 0)) throw new RangeError(`deadband must be at least 0, got ${deadband}`);
  if (value === null || Number.isNaN(value)) return 'unknown';
  const beyond = sense === 'below' ? limit - value : value - limit;
  if (beyond > 0) return 'active';
  return beyond <= -deadband ? 'clear' : 'between';
}
