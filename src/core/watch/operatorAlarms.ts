import type { Mode, UnitDefinition } from '../definitions.js';
import type { Quality } from '../estimate.js';
import { evidenceOf } from './condition.js';
import * as say from './messages.js';
import type { Step, WatchInput, WatchState } from './watch.js';

/** Near is within a tenth of the limit; back by half as much again. */
const NEAR_SHARE = 0.9;
const DEADBAND_SHARE = 0.05;
/** A gust of flow is over before anybody can act; the operator has a quarter of an hour. */
const DROP_DELAYS = { on_delay_s: 60, off_delay_s: 60 };
/** One scan without readings is no loss yet: `stale` has waited already, `blind` may be one scan. */
const BLIND_DELAYS = { on_delay_s: 180, off_delay_s: 60 };

/** A transmitter's zero may be off by so much of the greatest drop allowed; less than that is no drop. */
const ZERO_SHARE = 0.05;
/** Rock is lifted, or the machine has tripped, long before: no drop, as a share of the greatest allowed. */
const MOST_SHARE = 5;
/** So long without a drop that can be, and an alarm can no longer be judged [ms]. */
const LOST_MS = 10 * 60_000;

/** By store: source time of the last drop read that can be [ms]. Plain. */
export type DropsSeen = Record<string, number>;

/** Why a reading is no pressure drop. */
export type DropFault = 'silent' | 'negative' | 'beyond';

function faultOf(read_Pa: number | null, most_Pa: number, mode: Mode): DropFault | null {
  if (read_Pa === null) return 'silent';
  if (read_Pa > MOST_SHARE * most_Pa) return 'beyond';
  return mode !== 'stand' && read_Pa < -ZERO_SHARE * most_Pa ? 'negative' : null;
}

/**
 * The measured pressure drop of each store against the greatest allowed one [Pa]. A unit that stands
 * has none. A reading that no flow makes, below zero or several times the greatest allowed, is a finding
 * of its transmitter and no alarm; an alarm that has had no reading for ten minutes can no longer be
 * judged and returns with these words, as the finding then stands.
 *
 * @param state changed in place
 */
export function watchDrops(
  unit: UnitDefinition,
  state: WatchState,
  { time_ms, mode, drops_Pa = {}, readingsSeen }: WatchInput,
  step: Step,
): void {
  const most = unit.limits.pressure_drop_max_Pa ?? null;
  if (most === null) return;
  state.drops ??= {};
  const seen = state.drops;
  for (const [store, read_Pa] of Object.entries(drops_Pa)) {
    const fault = faultOf(read_Pa, most, mode);
    const drop = fault === null ? read_Pa : null;
    if (fault === null) seen[store] = time_ms;
    const last_ms = seen[store] ?? null;
    const isLost = last_ms === null || time_ms - last_ms >= LOST_MS;
    const limit = NEAR_SHARE * most;
    const rule = { limit, deadband: DEADBAND_SHARE * most };
    const judged = isLost ? 'clear' : evidenceOf({ ...rule, value: drop });
    const evidence = mode === 'stand' ? 'clear' : judged;
    step('pressure_drop_near_limit', store, evidence, DROP_DELAYS, drop, limit, (raised) =>
      raised
        ? say.dropRaised(store, drop ?? Number.NaN, most)
        : say.dropReturned(store, mode === 'stand' ? 'stands' : isLost ? 'lost' : 'away'),
    );
    const channel = channelOf(unit, store);
    if (channel === null) continue;
    // A channel that never gave anything is not connected yet: `check` tells what that costs.
    const tells = fault !== 'silent' || (last_ms !== null && readingsSeen > 0);
    const sensor = fault === null ? (mode === 'stand' ? 'unknown' : 'clear') : 'active';
    step(
      ...(['sensor_rejected', channel, tells ? sensor : 'unknown'] as const),
      ...([unit.watch.sensor_rejected, read_Pa, null] as const),
      () => (fault ? say.dropSensorRaised(channel, store, fault) : say.dropSensorReturned(channel)),
    );
  }
}

function channelOf({ channels }: UnitDefinition, store: string): string | null {
  const found = channels.findLast(
    ({ role }) => role.kind === 'pressure_drop' && role.store === store,
  );
  return found?.id ?? null;
}

/** A discharge whose estimate is no guide any more. */
export function watchBlind(unit: UnitDefinition, mode: Mode, quality: Quality, step: Step): void {
  const isLost = mode === 'discharge' && (quality === 'blind' || quality === 'stale');
  const evidence = isLost ? 'active' : 'clear';
  step('estimate_blind', unit.id, evidence, BLIND_DELAYS, null, null, (raised) =>
    raised ? say.blindRaised(unit.id, quality) : say.blindReturned(unit.id, mode),
  );
}
