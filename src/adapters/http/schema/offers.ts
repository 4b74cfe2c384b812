import { z } from 'zod';
import { COMMAND_CAUSES } from '../../../core/plan/leg.js';
import { MOST_CERTAINTIES } from '../../../core/plan/offerAsk.js';
import { UNTESTED } from '../../../core/plan/offerReport.js';
import { USUAL_CERTAINTIES } from '../../../core/plan/offerWords.js';
import { timeSchema } from './estimate.js';
import { answerHead, quantilesSchema, staleField } from './plan.js';
import {
  GREATEST_POWER_MW,
  historyQuery,
  hoursQuery,
  MOST_POWERS,
  unitParams,
} from './questions.js';

/** Schemas of offer tables: what is asked, what is answered, what is kept of them. */

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
      .max(200, { error: 'at most 200 stretches' })
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

const shares = z.record(z.string(), z.number());
const twoWays = (of: z.ZodNumber) =>
  z.object({
    alone: of.describe('Whatever becomes of the plan before, each block for itself'),
    jointly: of.describe('With the plan and all blocks before it'),
  });

const energyAt = {
  certainty: z.number(),
  energy_MWh_el: z
    .number()
    .describe('Net of what a start-up draws after the start; below 0 only where that is more'),
  expected_shortfall_MWh_el: z.number().describe('Expected value of what is missing below it'),
  mean_below_MWh_el: z.number().nullable().describe('Mean of what is given where it is less'),
};

const offerHead = {
  power_MW_el: z.number(),
  start: timeSchema,
  begins: timeSchema.describe('First power: later than the start where the unit is not ready'),
  refused: z.string().nullable().describe('Why it is not offered; null: it is'),
  hours: quantilesSchema.describe('From the first power on'),
  energy_MWh_el: quantilesSchema,
  plan_holds: z.number().nullable().describe('Probability that the plan until then is carried out'),
};

const offerSchema = z.object({
  ...offerHead,
  limited: z
    .array(
      z.object({
        cause: z.enum(COMMAND_CAUSES),
        from: timeSchema,
        to: timeSchema,
        missing_MW_el: z.number(),
      }),
    )
    .describe('What machine, connection or outages leave undone of what was asked'),
  start_up_MWh_el: z
    .object({ before_start: z.number(), after_start: z.number() })
    .describe('Drawn by change-over and start-up; what comes after the start is in the energies'),
  mean_hours: z.number(),
  mean_MWh_el: z.number(),
  ends_by: shares.describe('Probability of each cause that may end it'),
  at: z.array(z.object({ ...energyAt, hours: z.number(), whole_blocks: twoWays(z.int()) })),
  bid: z
    .object({ certainty: z.number(), energy_MWh_el: z.number() })
    .nullable()
    .describe('The certainty worth bidding by the prices given, and the energy there'),
  blocks: z.array(
    z.object({
      from: timeSchema,
      to: timeSchema,
      most_MWh_el: z.number().describe('If nothing stops it, ramps and start-up included'),
      mean_MWh_el: z.number(),
      whole: twoWays(z.number()).describe('Probability that it is run through'),
      at: z.array(z.object(energyAt)),
      bid_MWh_el: z.number().nullable(),
    }),
  ),
});

const table = {
  block_s: z.number(),
  certainties: z.array(z.number()),
  time_zone: z.string().nullable().describe('Of the grid of blocks; null: UTC'),
  offers: z.array(offerSchema),
};

export const offersSchema = z.object({
  ...answerHead,
  ...table,
  kept: z.int().nullable().describe('Number under which the table is kept; null: it is not'),
});

export const offersHistoryQuery = z.strictObject({
  from: historyQuery.shape.from,
  to: historyQuery.shape.to,
});

export const offersHistorySchema = z.object({
  unit: z.string(),
  from: timeSchema,
  to: timeSchema,
  tables: z
    .array(
      z.object({
        no: z.int(),
        asked: timeSchema,
        time: timeSchema.describe('Of the estimate that it stands on'),
        block_s: z.number(),
        offers: z.array(z.object(offerHead)),
      }),
    )
    .describe('Newest first, at most 100; without their blocks'),
});

const NO = 'the number of a kept table';
export const keptParams = unitParams.extend({
  no: z
    .string()
    .regex(/^\d{1,12}$/, { error: NO })
    .describe(NO)
    .transform(Number),
});

const keptShare = z.object({
  kept: z.int(),
  of: z.int(),
  meant: z.number(),
  share: z.number().nullable(),
  interval: z.tuple([z.number(), z.number()]).nullable().describe('95 %, by Wilson 1927'),
});

export const offersReportSchema = z.object({
  unit: z.string(),
  from: timeSchema,
  to: timeSchema,
  tested_by: z.string().describe('When an offer counts as put to the test'),
  p90: keptShare,
  p50: keptShare,
  tested: z.array(
    z.object({
      no: z.int(),
      asked: timeSchema,
      begins: timeSchema,
      power_MW_el: z.number(),
      energy_MWh_el: quantilesSchema,
      delivered_MWh_el: z.number(),
      ended_by: z.string(),
      kept: z.object({ p90: z.boolean(), p50: z.boolean() }),
    }),
  ),
  untested: z.record(z.enum(UNTESTED), z.int()).describe('Not put to the test, by reason'),
});
