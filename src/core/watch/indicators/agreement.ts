import { heldOf } from '../follow.js';
import type { Indicator, IndicatorRule, IndicatorView } from '../indicator.js';
import { isDue, viewed } from './view.js';

interface StringSeen {
  degraded: boolean;
  /** Last time that the string saw the front [ms], and the disagreement then in sigmas. */
  time_ms: number | null;
  value: number | null;
  /** When it was last shown [ms]. */
  shown_ms: number | null;
}

/**
 * Fitted front of each string against its tube, in sigmas of their difference. Both take the same
 * readings, so their difference hardly averages out over scans: limit and deadband act on it as it
 * stands, as they do in the event `front_view_disagrees` (watch.ts), and a string that does not see
 * the front says nothing.
 */
export const AGREEMENT: Indicator<Record<string, StringSeen>> = {
  kind: 'front_view',
  start: () => ({}),
  step(states, rule, _, input) {
    return input.model.stores.flatMap((model): IndicatorView[] => {
      const { id } = model.store;
      const views = input.estimate.stores[id]?.front_views ?? [];
      return model.tubes.map(({ string, layout }) => {
        const subject = `${id}/${string.id}`;
        const state = heldOf(states, subject, startHeld);
        const shown = views.find((view) => view.id === string.id);
        let changed = false;
        if (shown?.seen && shown.disagreement !== null) {
          const size = Math.abs(shown.disagreement);
          const before = state.degraded;
          if (size > rule.limit) state.degraded = true;
          else if (size <= rule.limit - rule.deadband) state.degraded = false;
          changed = state.degraded !== before || isDue(state.shown_ms, input.time_ms);
          if (changed) {
            state.value = shown.disagreement;
            state.time_ms = input.time_ms;
            state.shown_ms = input.time_ms;
          }
        }
        return viewed(state, rule, changed, () => view(subject, state, rule, layout.sensors >= 2));
      });
    });
  },
};

const startHeld = (): StringSeen => ({
  degraded: false,
  time_ms: null,
  value: null,
  shown_ms: null,
});

function view(
  subject: string,
  seen: StringSeen,
  rule: IndicatorRule,
  canSee: boolean,
): IndicatorView {
  const [store, string] = subject.split('/') as [string, string];
  const name = `Store ${store}, string ${string}`;
  const { value } = seen;
  const state = value === null ? 'undetermined' : seen.degraded ? 'degraded' : 'normal';
  const far = `the fitted front stands ${Math.abs(value ?? 0).toFixed(1)} sigmas ${(value ?? 0) > 0 ? 'further from' : 'nearer to'} the charge inlet than the bed model says (limit ${rule.limit.toFixed(1)})`;
  const sentence = !canSee
    ? `${name}: with fewer than two thermocouples no front can be fitted to it.`
    : {
        degraded: `${name}: ${far}. Look at the profile of this string, at its sensors, and at the flow meter.`,
        normal: `${name}: ${far}: they agree.`,
        undetermined: `${name}: it has not seen a front yet to hold against the bed model.`,
      }[state];
  return {
    kind: 'front_view',
    subject,
    value,
    sigma: value === null ? null : 1,
    unit: 'sigma',
    healthy: 0,
    healthy_from: 'law',
    limit: (value ?? 0) < 0 ? -rule.limit : rule.limit,
    deadband: rule.deadband,
    on_delay_s: rule.on_delay_s,
    off_delay_s: rule.off_delay_s,
    score: value === null ? null : Math.min(1, Math.abs(value) / rule.limit),
    state,
    reason: state !== 'undetermined' ? null : canSee ? 'not_exercised' : 'not_instrumented',
    time: seen.time_ms === null ? null : new Date(seen.time_ms).toISOString(),
    sentence,
  };
}
