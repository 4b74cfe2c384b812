import type { WatchDefinition } from '../definitions.js';
import { type ConditionState, startCondition, stepEvidence } from './condition.js';
import type { WatchEvent } from './event.js';
import { watchEvent } from './kinds.js';
import * as say from './messages.js';

/** A service that the daemon needs, such as the time-series database. Plain. */
export interface ServiceWatchState {
  condition: ConditionState;
  /** Time since which it does not answer [ms], null while it does. */
  down_ms: number | null;
}

export interface ServiceInput {
  /** Unit that the event is filed under. */
  readonly unit: string;
  /** Name of the service as a person knows it, such as `InfluxDB`. */
  readonly service: string;
  /** Time of the attempt [ms], by the daemon's own clock. */
  readonly time_ms: number;
  readonly reachable: boolean;
  /** What came back, in words; may be empty. */
  readonly detail: string;
}

export function startServiceWatch(): ServiceWatchState {
  return { condition: startCondition(), down_ms: null };
}

/**
 * Takes one attempt to reach a service in, for `database_unreachable`: the same life cycle as the
 * unit's own conditions, called by the daemon after each attempt.
 *
 * @param state changed in place
 * @returns the event where it was raised or returned now, else null
 */
export function stepServiceWatch(
  rule: WatchDefinition['database_down'],
  state: ServiceWatchState,
  input: ServiceInput,
): WatchEvent | null {
  const { unit, service, reachable, detail } = input;
  // A wall clock may be set back; here it stands still until it has caught up.
  const time_ms = Math.max(input.time_ms, state.condition.last_ms ?? input.time_ms);
  if (reachable) state.down_ms = null;
  else state.down_ms ??= time_ms;
  const transition = stepEvidence(state.condition, reachable ? 'clear' : 'active', {
    ...rule,
    time_ms,
  });
  if (transition === null) return null;
  const down_s = state.down_ms === null ? 0 : (time_ms - state.down_ms) / 1000;
  return watchEvent({
    unit,
    kind: 'database_unreachable',
    subject: service,
    transition,
    time_ms,
    value: down_s,
    limit: rule.on_delay_s,
    message:
      transition === 'raised'
        ? say.databaseRaised(service, down_s, detail)
        : say.databaseReturned(service),
  });
}
