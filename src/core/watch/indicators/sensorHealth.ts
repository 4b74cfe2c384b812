import { heldOf } from '../follow.js';
import type { Indicator, IndicatorRule, IndicatorView } from '../indicator.js';
import { dayOf, isDue, viewed } from './view.js';

interface Health {
  degraded: boolean;
  /** Thermocouples that are not believed, of how many; null before the first reading. */
  rejected: number | null;
  all: number;
  /** When it was last counted for the view [ms]. */
  shown_ms: number | null;
}

/**
 * Share of a store's thermocouples that is not believed. Each has been judged statistically before it
 * was left out (track/judge*.ts); of their number limit and deadband decide. Those of a group that is
 * off together are used on by their differences, and count none the less: the level is lost.
 */
export const SENSOR_HEALTH: Indicator<Record<string, Health>> = {
  kind: 'sensor_health',
  start: () => ({}),
  step(states, rule, _, input) {
    return input.model.stores.map(({ store, tubes }): IndicatorView => {
      const state = heldOf(states, store.id, startHeld);
      const estimate = input.estimate.stores[store.id];
      const started = estimate !== undefined && estimate.fronts_reason !== 'not_started';
      const rejected = started ? estimate.sensors.rejected.length : null;
      const changed = rejected !== state.rejected || isDue(state.shown_ms, input.time_ms);
      if (changed) {
        state.rejected = rejected;
        state.all = tubes.reduce((sum, tube) => sum + tube.layout.sensors, 0);
        state.shown_ms = input.time_ms;
        const share = shareOf(state);
        if (share > rule.limit) state.degraded = true;
        else if (share <= rule.limit - rule.deadband) state.degraded = false;
      }
      return viewed(state, rule, changed, () => view(store.id, state, rule));
    });
  },
};

const startHeld = (): Health => ({ degraded: false, rejected: null, all: 0, shown_ms: null });

const shareOf = ({ rejected, all }: Health): number => (rejected ?? 0) / Math.max(1, all);

function view(store: string, state: Health, rule: IndicatorRule): IndicatorView {
  const started = state.rejected !== null;
  const share = shareOf(state);
  const limit = `(limit ${(100 * rule.limit).toFixed(0)} %)`;
  const count = `Store ${store}: ${state.rejected} of ${state.all} thermocouples are not believed ${limit}.`;
  const what = state.degraded
    ? `${count} Fronts and energy are less certain; what many have in common is a card, a cable or a cold junction.`
    : count;
  return {
    kind: 'sensor_health',
    subject: store,
    value: started ? share : null,
    // A count is what it is.
    sigma: started ? 0 : null,
    unit: '-',
    healthy: 0,
    healthy_from: 'law',
    limit: rule.limit,
    deadband: rule.deadband,
    on_delay_s: rule.on_delay_s,
    off_delay_s: rule.off_delay_s,
    score: started ? Math.min(1, share / rule.limit) : null,
    state: !started ? 'undetermined' : state.degraded ? 'degraded' : 'normal',
    reason: started ? null : 'not_exercised',
    time: started ? dayOf(state.shown_ms) : null,
    sentence: started ? what : `Store ${store}: it has not been read yet.`,
  };
}
