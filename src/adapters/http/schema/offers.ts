import { z } from 'zod';
import { COMMAND_CAUSES } from '../../../core/plan/leg.js';
import { UNTESTED } from '../../../core/plan/offerReport.js';
import { firstMinutesSchema, timeSchema } from './estimate.js';
import { answerHead, quantilesSchema } from './plan.js';

/** Schemas of offer tables, of those kept, and of their report. */

const shares = z.record(z.string(), z.number());
const twoWays = (of: z.ZodNumber) =>
  z.object({
    alone: of.describe('Whatever becomes of the plan before, each block for itself'),
    jointly: of.describe('With the plan and all blocks before it'),
  });

const energyAt = {
  certainty: z.number(),
  energy_MWh_el: z.number().describe('Given from the first power on'),
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
  plan_holds: z
    .number()
    .nullable()
    .describe('Probability that the plan until then is carried out as asked; 0 with plan_limited'),
  plan_stores_hold: z
    .number()
    .nullable()
    .optional()
    .describe('That the stores carry what the machine can do of it; not in tables kept before'),
};

const limited = {
  cause: z.enum(COMMAND_CAUSES),
  from: timeSchema,
  to: timeSchema,
  missing_MW_el: z.number(),
};

const offerSchema = z.object({
  ...offerHead,
  limited: z
    .array(z.object(limited))
    .describe('What machine, connection or outages leave undone of what was asked'),
  plan_limited: z
    .array(z.object({ leg: z.int().describe('Of the plan asked for, from 0'), ...limited }))
    .optional()
    .describe('The same of the plan until the start; not in tables kept before'),
  start_up_MWh_el: z
    .object({ before_start: z.number(), after_start: z.number() })
    .describe('Drawn by change-over and start-up, before and after the start; not in the energies'),
  mean_hours: z.number(),
  mean_MWh_el: z.number(),
  ends_by: shares.describe('Probability of each cause that may end it'),
  first_minutes: firstMinutesSchema,
  at: z.array(z.object({ ...energyAt, hours: z.number(), whole_blocks: twoWays(z.int()) })),
  bid: z
    .object({ certainty: z.number(), energy_MWh_el: z.number() })
    .nullable()
    .describe('The certainty worth bidding by the prices given, and the energy there'),
  blocks: z.array(
    z.object({
      from: timeSchema,
      to: timeSchema,
      most_MWh_el: z.number().describe('If nothing stops it, ramps included'),
      drawn_MWh_el: z
        .number()
        .optional()
        .describe('Drawn before the first power: end of a charge, change-over, start-up, standing'),
      ramp_down_MWh_el: z
        .number()
        .optional()
        .describe('Given before the first power by a planned discharge that comes down'),
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
  older_left_out: z.boolean().describe('true: there are more in that time; ask for less of it'),
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
  tables: z.int().describe('Kept tables looked at: the newest 2000'),
  older_left_out: z.boolean().describe('true: there are more in that time; ask for less of it'),
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
