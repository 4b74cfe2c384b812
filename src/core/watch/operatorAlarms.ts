import type { Mode, UnitDefinition } from '../definitions.js';
import type { Quality } from '../estimate.js';
import { evidenceOf } from './condition.js';
import * as say from './messages.js';
import type { Step } from './watch.js';

/** Near is within a tenth of the limit; back by half as much again. */
const NEAR_SHARE = 0.9;
const DEADBAND_SHARE = 0.05;
/** A gust of flow is over before anybody can act; the operator has a quarter of an hour. */
const DROP_DELAYS = { on_delay_s: 60, off_delay_s: 60 };
/** One scan without readings is no loss yet: `stale` has waited already, `blind` may be one scan. */
const BLIND_DELAYS = { on_delay_s: 180, off_delay_s: 60 };

/**
 * The measured pressure drop of each store against the greatest allowed one [Pa], in either direction
 * of the flow. A unit that stands has none.
 */
export function watchDrop(
  unit: UnitDefinition,
  mode: Mode,
  drops_Pa: Readonly<Record<string, number | null>>,
  step: Step,
): void {
  const most = unit.limits.pressure_drop_max_Pa ?? null;
  if (most === null) return;
  for (const [store, read_Pa] of Object.entries(drops_Pa)) {
    const drop = read_Pa === null ? null : Math.abs(read_Pa);
    const limit = NEAR_SHARE * most;
    const rule = { limit, deadband: DEADBAND_SHARE * most };
    const evidence = mode === 'stand' ? 'clear' : evidenceOf({ ...rule, value: drop });
    step('pressure_drop_near_limit', store, evidence, DROP_DELAYS, drop, limit, (raised) =>
      raised ? say.dropRaised(store, drop ?? Number.NaN, most) : say.dropReturned(store),
    );
  }
}

/** A discharge whose estimate is no guide any more. */
export function watchBlind(unit: UnitDefinition, mode: Mode, quality: Quality, step: Step): void {
  const isLost = mode === 'discharge' && (quality === 'blind' || quality === 'stale');
  const evidence = isLost ? 'active' : 'clear';
  step('estimate_blind', unit.id, evidence, BLIND_DELAYS, null, null, (raised) =>
    raised ? say.blindRaised(unit.id, quality) : say.blindReturned(unit.id),
  );
}
