import type { Estimate } from '../../core/estimate.js';
import type { PlanAnswers, PlanQuestion } from '../../core/plan/ask.js';
import { aheadHead } from '../../core/plan/head.js';
import { HttpFault } from './faults.js';
import type { PlantService, UnitNow } from './service.js';
import { ageOf } from './views.js';

/**
 * The estimate that an answer about what lies ahead would stand on.
 *
 * @throws HttpFault where there is none, or a stale one and these are refused
 */
export function requireEstimate(now: UnitNow, stale: 'refuse' | 'mark' | undefined): Estimate {
  const unit = now.unit.id;
  if (now.estimate === null) {
    throw new HttpFault(503, 'no_estimate_yet', `unit ${unit} has no estimate yet`, {
      field: 'unit',
      value: unit,
    });
  }
  if (now.stale && stale !== 'mark') {
    const age = now.age_s === null ? 'unknown' : `${Math.round(now.age_s)} s`;
    throw new HttpFault(
      503,
      'estimate_stale',
      `the estimate of unit ${unit} is stale (its newest reading is ${age} old); ask with stale=mark for an answer all the same`,
      { field: 'stale', value: stale ?? 'refuse', expected: 'mark' },
    );
  }
  return now.estimate;
}

export { aheadHead as headOf };

/**
 * The whole head of an answer.
 *
 * @param asked the unit when it was asked; the age is that of now
 * @param time of the estimate that the answer stands on
 */
export function fullHead(service: PlantService, asked: UnitNow, estimate: Estimate, time: string) {
  const { unit } = asked;
  const after = service.now(unit.id) ?? asked;
  return {
    age_s: ageOf(after, time),
    stale: after.stale,
    ...aheadHead(unit, time, estimate.quality, after.stale),
  };
}

/**
 * Asks about what lies ahead of a unit's present state, with the head that every such answer has.
 *
 * @throws HttpFault where there is no estimate, where it is stale and stale ones are refused, where
 *   the question is wrong, or where it could not be answered
 */
export async function askPlan<K extends PlanQuestion['kind']>(
  service: PlantService,
  now: UnitNow,
  stale: 'refuse' | 'mark' | undefined,
  question: PlanQuestion & { readonly kind: K },
) {
  const unit = now.unit.id;
  const estimate = requireEstimate(now, stale);
  let found: Awaited<ReturnType<PlantService['plan']>>;
  try {
    found = await service.plan(unit, question);
  } catch (cause) {
    const why = cause instanceof Error ? cause.message : String(cause);
    const fault = new HttpFault(503, 'question_failed', `${question.kind} of unit ${unit}: ${why}`);
    fault.cause = cause;
    throw fault;
  }
  const { time } = found;
  const head = fullHead(service, now, estimate, time);
  return { head, answer: found.answer as PlanAnswers[K] };
}
