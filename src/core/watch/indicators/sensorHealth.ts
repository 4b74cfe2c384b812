import { heldOf } from '../follow.js';
import type { Indicator, IndicatorView } from '../indicator.js';

/**
 * Share of a store's thermocouples that is not believed. Each has been judged statistically before it
 * was left out (track/judge*.ts); of their number limit and deadband decide. Those of a group that is
 * off together are used on by their differences, and count none the less: the level is lost.
 */
export const SENSOR_HEALTH: Indicator<Record<string, { degraded: boolean }>> = {
  kind: 'sensor_health',
  start: () => ({}),
  step(states, rule, _, input) {
    return input.model.stores.map(({ store, tubes }): IndicatorView => {
      const state = heldOf(states, store.id, () => ({ degraded: false }));
      const all = tubes.reduce((sum, tube) => sum + tube.layout.sensors, 0);
      const started = input.estimate.stores[store.id]?.fronts_reason !== 'not_started';
      const rejected = input.estimate.stores[store.id]?.sensors.rejected ?? [];
      const share = rejected.length / Math.max(1, all);
      if (share > rule.limit) state.degraded = true;
      else if (share <= Math.max(0, rule.limit - rule.deadband)) state.degraded = false;
      const count = `Store ${store.id}: ${rejected.length} of ${all} thermocouples are not believed`;
      const limit = `(limit ${(100 * rule.limit).toFixed(0)} %)`;
      const what = state.degraded
        ? `${count} ${limit}. Fronts and energy are less certain; what many have in common is a card, a cable or a cold junction.`
        : `${count} ${limit}.`;
      return {
        kind: 'sensor_health',
        subject: store.id,
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
        time: started ? new Date(input.time_ms).toISOString() : null,
        sentence: started ? what : `Store ${store.id}: it has not been read yet.`,
      };
    });
  },
};
