import { z } from 'zod';
import { MOST_CERTAINTIES, MOST_LEGS } from '../../../core/plan/offerAsk.js';
import { USUAL_CERTAINTIES } from '../../../core/plan/offerWords.js';
import { staleField } from './plan.js';
import {
  GREATEST_POWER_MW,
  historyQuery,
  hoursQuery,
  MOST_POWERS,
  unitParams,
} from './questions.js';

/** Schemas of what is asked of offer tables and of those that were kept. */

const BLOCK = '15, 30 or 60, the length of a block in minutes';
const CERTAINTY = `1 to ${MOST_CERTAINTIES} probabilities from 0.50 to 0.99, such as 0.5,0.9`;
const START =
  'times in ISO 8601 with offset (or local to the connection), such as 2026-01-31T18:00:00Z';
const COST = 'a number above 0, per MWh_el';
const KEEP = 'true or false';
const NUMBER = /^\d+(\.\d+)?$/;

const certainty = z.number({ error: CERTAINTY }).min(0.5, { error: CERTAINTY });

function numeral(expected: string) {
  return z
    .string({ error: expected })
    .regex(NUMBER, { error: expected })
    .describe(expected)
    .transform(Number);
}

const blockMinutes = [15, 30, 60] as const;

export const offersQuery = z.strictObject({
  power_MW: hoursQuery.shape.power_MW,
  start: z
    .string({ error: START })
    .describe(START)
    .transform((text) => text.split(',').map((part) => part.trim()))
    .optional(),
  closes_before_min: numeral(
    'minutes from now until delivery may begin at the earliest',
  ).optional(),
  count: numeral('how many starts, from the closing of the gate on; without it 1').optional(),
  every_min: numeral('minutes from one start to the next; without it a block').optional(),
  block_min: z.enum(['15', '30', '60'], { error: BLOCK }).describe(BLOCK).optional(),
  certainty: z
    .string({ error: CERTAINTY })
    .describe(CERTAINTY)
    .transform((text, context) => {
      const parts = text.split(',').map((part) => part.trim());
      const values = parts.map((part) => (NUMBER.test(part) ? Number(part) : Number.NaN));
      if (values.every((value) => value >= 0.5 && value <= 0.99)) return values;
      context.addIssue({ code: 'custom', message: CERTAINTY });
      return z.NEVER;
    })
    .optional(),
  horizon_h: numeral('hours of the longest discharge that is offered').optional(),
  shortfall_per_MWh_el: numeral(COST).optional(),
  surplus_per_MWh_el: numeral(COST).optional(),
  keep: z.enum(['true', 'false'], { error: KEEP }).describe('Keep the table for good').optional(),
  stale: staleField,
  format: historyQuery.shape.format,
});

const power = (error: string) =>
  z.number({ error }).min(0, { error }).max(GREATEST_POWER_MW, { error });
const POWER = `a number of MW, 0 to ${GREATEST_POWER_MW}`;
const POWERS = `1 to ${MOST_POWERS} powers in MW, each above 0 and at most ${GREATEST_POWER_MW}`;
const time = (what: string) => z.string({ error: START }).describe(what);
const minutes = (what: string) => z.number({ error: what }).min(0, { error: what }).describe(what);

export const offersBody = z.strictObject(
  {
    powers_MW_el: z
      .array(z.number({ error: POWERS }).gt(0, { error: POWERS }).max(GREATEST_POWER_MW), {
        error: POWERS,
      })
      .min(1, { error: POWERS })
      .max(MOST_POWERS, { error: POWERS })
      .describe('Discharging, net at the connection point'),
    starts: z
      .array(z.string({ error: START }), { error: START })
      .min(1, { error: START })
      .describe('When each discharge begins, on the grid of blocks; or gate')
      .optional(),
    gate: z
      .strictObject(
        {
          closes_before_min: minutes('minutes from now until delivery may begin at the earliest'),
          count: z.int({ error: 'a whole number of starts' }).min(1).default(1),
          every_min: minutes('minutes from one start to the next').optional(),
        },
        { error: 'an object {"closes_before_min": ..., "count": ..., "every_min": ...}' },
      )
      .describe('Starts on the grid of blocks, counted from the closing of the market')
      .optional(),
    block_min: z
      .literal([...blockMinutes], { error: BLOCK })
      .describe(BLOCK)
      .default(15),
    certainties: z
      .array(certainty.max(0.99, { error: CERTAINTY }), { error: CERTAINTY })
      .min(1, { error: CERTAINTY })
      .max(MOST_CERTAINTIES, { error: CERTAINTY })
      .describe('Probabilities with which a figure is at least reached')
      .default([...USUAL_CERTAINTIES]),
    plan: z
      .array(
        z.strictObject({
          mode: z.enum(['charge', 'discharge', 'stand'], { error: 'charge, discharge or stand' }),
          power_MW_el: power(POWER).default(0).describe('Net at the connection point, at least 0'),
          from: time('When it begins'),
          to: time('When it ends'),
        }),
      )
      .max(MOST_LEGS, { error: `at most ${MOST_LEGS} legs` })
      .describe('What the unit does until each start; where nothing is planned it stands')
      .default([]),
    horizon_h: z
      .number({ error: 'hours above 0' })
      .gt(0, { error: 'hours above 0' })
      .describe('Longest discharge that is offered')
      .optional(),
    prices: z
      .strictObject({
        shortfall_per_MWh_el: z
          .number({ error: COST })
          .gt(0, { error: COST })
          .describe('What each MWh_el sold and not given costs beyond the price it was sold at'),
        surplus_per_MWh_el: z
          .number({ error: COST })
          .gt(0, { error: COST })
          .describe('Price of each MWh_el not sold, less what it is worth kept'),
      })
      .optional(),
    keep: z
      .boolean({ error: KEEP })
      .describe('Keep the table for good, for its history and its report')
      .default(true),
    stale: staleField,
    format: historyQuery.shape.format,
  },
  { error: 'an object {"powers_MW_el": [...], "starts": [...]}' },
);

export const offersHistoryQuery = z.strictObject({
  from: historyQuery.shape.from,
  to: historyQuery.shape.to,
});

const NO = 'the number of a kept table';
export const keptParams = unitParams.extend({
  no: z
    .string()
    .regex(/^\d{1,12}$/, { error: NO })
    .describe(NO)
    .transform(Number),
});
