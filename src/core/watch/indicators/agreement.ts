import type { Mode } from '../../definitions.js';
import { heldOf } from '../follow.js';
import type {
  Indicator,
  IndicatorRule,
  IndicatorsDefinition,
  IndicatorView,
} from '../indicator.js';
import {
  decisionAt,
  type SequentialState,
  sequentialScore,
  startSequential,
  stepSequential,
} from '../sequential.js';
import { normalWords } from '../side.js';
import { dayOf, isDue, viewed } from './view.js';
import { pitchOf, type WayState, wayOf } from './way.js';

interface StringSeen {
  /** Further from the charge inlet, and nearer to it. */
  readonly tests: readonly [SequentialState, SequentialState];
  readonly way: WayState;
  /** Of the run under way: places taken, one per pitch of the thermocouples, and their sum [sigmas]. */
  run: { mode: Mode; count: number; sum: number };
  /** Mean of the last run that counted [sigmas]. */
  mean: number | null;
  /** Disagreement as shown [sigmas], and since when; null before the string has seen a front. */
  value: number | null;
  time_ms: number | null;
}

/** A unit runs one way some four times a day: mean spacing of values [s]. */
const VALUE_EVERY_S = 6 * 3600;
/** Tests of each string: the fit may stand off to either side. */
const SIDES = 2;

/**
 * Fitted front of each string against its tube, in sigmas of their difference. Neither is right to the
 * last: a fit that crosses a thermocouple, or two fronts that meet, set them apart for a while. So one
 * place counts each time the front has gone the pitch of the thermocouples. What sets them apart stays
 * so while the front goes one way, so that the places of a run are no news of each other: their mean is
 * one value, taken when the run is over, healthy up to limit less deadband, degraded from limit and
 * deadband on, which decides for the limit between; a string that does not see the front says nothing.
 */
export const AGREEMENT: Indicator<Record<string, StringSeen>> = {
  kind: 'front_view',
  start: () => ({}),
  step(states, rule, watching, input) {
    return input.model.stores.flatMap((model, s): IndicatorView[] => {
      const { id } = model.store;
      const views = input.estimate.stores[id]?.front_views ?? [];
      const travelled = input.state.views[s]?.twin.travelled_m ?? 0;
      return model.tubes.map(({ string, layout }) => {
        const subject = `${id}/${string.id}`;
        const state = heldOf(states, subject, startHeld);
        const shown = views.find((view) => view.id === string.id);
        const way_m = wayOf(state.way, travelled);
        const { mode } = input.taken.conditions;
        let changed = mode !== state.run.mode && endRun(state, mode, rule, watching);
        if (shown?.seen && shown.disagreement !== null) {
          const counts = way_m >= pitchOf(model);
          if (counts) {
            state.run.sum += shown.disagreement;
            state.run.count++;
            state.way.way_m = 0;
          }
          if (counts || changed || isDue(state.time_ms, input.time_ms)) {
            changed = true;
            state.value = shown.disagreement;
            state.time_ms = input.time_ms;
          }
        }
        const canSee = layout.sensors >= 2;
        return viewed(state, rule, changed, () => view(subject, state, rule, watching, canSee));
      });
    });
  },
};

const startHeld = (): StringSeen => ({
  tests: [startSequential(), startSequential()],
  way: { travelled_m: 0, way_m: 0 },
  run: { mode: 'stand', count: 0, sum: 0 },
  mean: null,
  value: null,
  time_ms: null,
});

/** @returns whether the run that is over gave a value */
function endRun(
  state: StringSeen,
  mode: Mode,
  rule: IndicatorRule,
  watching: IndicatorsDefinition,
): boolean {
  const { count, sum } = state.run;
  state.run = { mode, count: 0, sum: 0 };
  if (count === 0) return false;
  state.mean = sum / count;
  take(state, state.mean, rule, watching);
  return true;
}

function take(
  { tests }: StringSeen,
  sigmas: number,
  { limit, deadband }: IndicatorRule,
  watching: IndicatorsDefinition,
): void {
  const decision = decisionAt(watching.in_control_d, VALUE_EVERY_S, SIDES);
  const sides = { healthy: limit - deadband, degraded: limit + deadband, sigma: 1 };
  stepSequential(tests[0], { ...sides, value: sigmas }, decision);
  stepSequential(tests[1], { ...sides, value: -sigmas }, decision);
}

function view(
  subject: string,
  { tests, value, mean, time_ms }: StringSeen,
  rule: IndicatorRule,
  watching: IndicatorsDefinition,
  canSee: boolean,
): IndicatorView {
  const [store, string] = subject.split('/') as [string, string];
  const name = `Store ${store}, string ${string}`;
  const degraded = tests.some((test) => test.degraded);
  const state = degraded ? 'degraded' : value === null ? 'undetermined' : 'normal';
  const decision = decisionAt(watching.in_control_d, VALUE_EVERY_S, SIDES);
  const far = (sigmas: number) =>
    `the fitted front stands ${Math.abs(sigmas).toFixed(1)} sigmas ${sigmas > 0 ? 'further from' : 'nearer to'} the charge inlet than the bed model says (limit ${rule.limit.toFixed(1)})`;
  const score = value === null ? null : Math.max(...tests.map((t) => sequentialScore(t, decision)));
  const tested = mean ?? value;
  const limit = (tested ?? 0) < 0 ? -rule.limit : rule.limit;
  const words = normalWords(
    { value: tested, healthy: 0, limit, score },
    'over whole runs they agree',
  );
  const sentence = !canSee
    ? `${name}: with fewer than two thermocouples no front can be fitted to it.`
    : {
        degraded: `${name}: over whole runs ${far(mean ?? 0)}. Hours go by the bed model. Look at the profile of this string, at its sensors, and at the flow meter.`,
        normal: `${name}: ${far(value ?? 0)}; ${words}.`,
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
    score,
    state,
    reason: state !== 'undetermined' ? null : canSee ? 'not_exercised' : 'not_instrumented',
    time: dayOf(time_ms),
    sentence,
  };
}
