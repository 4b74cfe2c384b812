import { z } from 'zod';
import { END_CAUSES } from '../../../core/estimate.js';
import { COMMAND_CAUSES } from '../../../core/plan/leg.js';
import { NEAREST_REASONS } from '../../../core/plan/nearest.js';
import {
  GREATEST_CERTAINTY,
  LEAST_CERTAINTY,
  MODES,
  MOST_BLOCKS,
} from '../../../core/plan/scheduleAsk.js';
import { firstMinutesSchema, timeSchema } from './estimate.js';
import { answerHead, staleField } from './plan.js';
import { GREATEST_POWER_MW, historyQuery } from './questions.js';

/** Schemas of the schedule check: what is asked, and what is answered. */

const CERTAINTY = `a probability from ${LEAST_CERTAINTY} to ${GREATEST_CERTAINTY}, as in 0.9`;
const ZONE = 'an IANA time zone such as Europe/Paris';
const TIME = 'a time in ISO 8601 with offset, or local to the zone, as in 2026-03-28T17:00+01:00';
const POWER = `a power in MW_el from 0 to ${GREATEST_POWER_MW}: the direction is told by the mode`;
const MODE = `one of ${MODES.join(', ')}`;
const BLOCKS = `1 to ${MOST_BLOCKS} blocks`;
export const BODY =
  'an object {"blocks": [{"mode", "power_MW_el", "from", "to"}]}, or CSV as text/csv';

const zone = z
  .string({ error: ZONE })
  .min(1, { error: ZONE })
  .max(64, { error: ZONE })
  .describe(
    'IANA zone of times without offset, and of the answer; without it that of the connection',
  )
  .optional();

export const scheduleQuery = z.strictObject({
  certainty: z
    .string({ error: CERTAINTY })
    .regex(/^(0?\.\d{1,6}|1(\.0*)?|0)$/, { error: CERTAINTY })
    .describe(`${CERTAINTY}; without it 0.9`)
    .transform(Number)
    .refine((c) => c >= LEAST_CERTAINTY && c <= GREATEST_CERTAINTY, { error: CERTAINTY })
    .optional(),
  zone,
  stale: staleField,
  format: historyQuery.shape.format,
});

const time = z.string({ error: TIME });

export const scheduleBody = z.strictObject(
  {
    blocks: z
      .array(
        z.strictObject(
          {
            mode: z.enum(MODES, { error: MODE }),
            power_MW_el: z
              .number({ error: POWER })
              .min(0, { error: POWER })
              .max(GREATEST_POWER_MW, { error: POWER })
              .describe('Net at the connection point, taken or given; none while standing')
              .nullish(),
            from: time.describe(TIME),
            to: time.describe(TIME),
          },
          { error: 'an object {"mode", "power_MW_el", "from", "to"}' },
        ),
        { error: BLOCKS },
      )
      .min(1, { error: BLOCKS })
      .max(MOST_BLOCKS, { error: BLOCKS })
      .describe('In any order, not overlapping; between them the unit stands'),
    certainty: z
      .number({ error: CERTAINTY })
      .min(LEAST_CERTAINTY, { error: CERTAINTY })
      .max(GREATEST_CERTAINTY, { error: CERTAINTY })
      .describe('Of the firm figures and of the nearest schedule; without it 0.9')
      .optional(),
    zone,
    stale: staleField,
    format: historyQuery.shape.format,
  },
  { error: BODY },
);

const block = {
  mode: z.enum(MODES),
  power_MW_el: z.number(),
  from: timeSchema,
  to: timeSchema,
};
const probability = z.number().min(0).max(1);
const reserve = z.number().nullable();
const short = z.object({
  time: timeSchema,
  MWh_el: z.number().describe('From then to the end of the run'),
  cause: z.enum([...END_CAUSES, ...COMMAND_CAUSES]),
});
const shortfall = z
  .object({ p50: short.nullable(), certain: short.nullable() })
  .describe('null: nothing is short, with 50 % and with the certainty asked for');

export const scheduleSchema = z.object({
  ...answerHead,
  certainty: probability.describe('Asked for'),
  probability: probability.describe(
    'That everything is done as asked, ramps aside; 0 where anything is unmet',
  ),
  stores_probability: probability.describe(
    'That the stores carry all runs to their end, jointly, as far as the machine can be commanded',
  ),
  ramp_MWh_el: z.number().describe('What ramps take from the blocks, in all: no shortfall'),
  planned_net_MWh_el: z.number().describe('As asked for in the blocks, + = given'),
  expected_net_MWh_el: z
    .number()
    .describe('Mean of the whole, + = given, all that is drawn included'),
  net_MWh_el: z
    .number()
    .describe(
      'Most likely, + = given: the net of all blocks, less between_MWh_el, plus ramps_between_MWh_el',
    ),
  between_MWh_el: z
    .number()
    .describe('Drawn outside the blocks: start-ups, change-overs and standing, at least 0'),
  ramps_between_MWh_el: z.number().describe('Of ramps outside the blocks, + = given'),
  unmet: z
    .array(
      z.object({
        block: z.number().int().describe('Index in blocks'),
        cause: z.enum(COMMAND_CAUSES),
        from: timeSchema,
        to: timeSchema,
        missing_MW_el: z.number(),
        MWh_el: z.number(),
      }),
    )
    .describe('What machine limits, connection and outages leave undone, whatever the beds hold'),
  first_shortfall: shortfall,
  first_stores_shortfall: shortfall.describe('Of the stores alone'),
  blocks: z.array(
    z.object({
      ...block,
      planned_MWh_el: z.number(),
      expected_MWh_el: z.number().describe('In the direction of the block, as all but net'),
      certain_MWh_el: z.number().describe('At least this with the certainty asked for'),
      expected_shortfall_MWh_el: z.number().describe('Unmet, and what the stores leave short'),
      unmet_MWh_el: z.number(),
      ramp_MWh_el: z.number(),
      net_MWh_el: z
        .number()
        .describe('Most likely, + = given; ramps, start-ups and standing included'),
      met_probability: probability,
    }),
  ),
  runs: z.array(
    z.object({
      mode: z.enum(MODES),
      from: timeSchema,
      to: timeSchema,
      probability,
      reserve_hours: z
        .object({ p90: reserve, p50: reserve, p10: reserve })
        .describe('Past its end, below 0 it falls short; null: more than reserve_looked_hours'),
      ends_by: z.enum(END_CAUSES).nullable(),
      stops: timeSchema.nullable().describe('On the most likely course; null: it does not'),
      first_minutes: firstMinutesSchema,
    }),
  ),
  reserve_looked_hours: z.number(),
  charge: z
    .array(
      z.object({
        time: timeSchema,
        state_of_charge: z.number(),
        state_of_charge_sigma: z.number(),
        stores: z.record(z.string(), z.object({ soc: z.number(), soc_sigma: z.number() })),
      }),
    )
    .describe('Now, at the edges of blocks and where runs stop, on the most likely course'),
  charge_left_out: z.number().int(),
  nearest: z
    .object({
      blocks: z.array(z.object(block)),
      factor_discharge: z.number(),
      factor_charge: z.number(),
      drawn_in: z.array(z.object({ mode: z.enum(MODES), asked: timeSchema, to: timeSchema })),
      taken_out: z.boolean(),
      probability,
    })
    .nullable()
    .describe('Nearest schedule that holds at the certainty; null: none was found'),
  nearest_reason: z
    .enum(NEAREST_REASONS)
    .nullable()
    .describe(
      'Why there is none: nothing of it is allowed, not a minute of it holds, or none was found',
    ),
});
