import type { UnitDefinition } from '../definitions.js';
import { unitModel } from '../unitModel.js';
import type { UnitState } from '../unitState.js';
import { type Balance, type BalanceAsk, balanceOf } from './balance.js';
import { type Capability, type CapabilityAsk, capabilityOf } from './capability.js';
import { planContext } from './context.js';
import { type Headroom, type HeadroomAsk, headroomOf } from './headroom.js';
import type { OffersAsk } from './offerAsk.js';
import { type Offer, offersOf } from './offers.js';
import { type Schedule, scheduleOf } from './schedule.js';
import type { ScheduleAsk } from './scheduleAsk.js';

/** A question about what lies ahead of a unit's present state. */
export type PlanQuestion =
  | { readonly kind: 'headroom'; readonly ask: HeadroomAsk }
  | { readonly kind: 'capability'; readonly ask: CapabilityAsk }
  | { readonly kind: 'balance'; readonly ask: BalanceAsk }
  | { readonly kind: 'offers'; readonly ask: OffersAsk }
  | { readonly kind: 'schedule'; readonly ask: ScheduleAsk };

/** What each kind of question is answered with. */
export interface PlanAnswers {
  readonly headroom: Headroom[];
  readonly capability: Capability;
  readonly balance: Balance;
  readonly offers: Offer[];
  readonly schedule: Schedule;
}
export type PlanAnswer = PlanAnswers[keyof PlanAnswers];

/**
 * Answers a question from the present state, which is left as it is.
 *
 * @throws RangeError for a wrong question, and before every store has started
 */
export function answerPlan(
  unit: UnitDefinition,
  state: UnitState,
  question: PlanQuestion,
): PlanAnswer {
  const context = planContext(unitModel(unit), state);
  switch (question.kind) {
    case 'headroom':
      return headroomOf(context, question.ask);
    case 'capability':
      return capabilityOf(context, question.ask);
    case 'balance':
      return balanceOf(context, question.ask);
    case 'offers':
      return offersOf(context, question.ask);
    case 'schedule':
      return scheduleOf(context, question.ask);
  }
}
