import { z } from 'zod';
import { END_CAUSES, QUALITIES } from '../../../core/estimate.js';
import { COMMAND_CAUSES } from '../../../core/plan/leg.js';
import { firstMinutesSchema, timeSchema } from './estimate.js';
import { limitsSchema } from './limits.js';
import { hoursQuery } from './questions.js';

/** Schemas of questions about what lies ahead, and of their answers. */

const STALE = 'refuse or mark';

/** Asked with every such question. */
export const staleField = z
  .enum(['refuse', 'mark'], { error: STALE })
  .describe(
    'What to do where the estimate is stale: refuse to answer (default), or answer and mark it',
  )
  .optional();

/** Head of every answer about what lies ahead. */
export const answerHead = {
  unit: z.string(),
  time: timeSchema.describe('Source time of the estimate that the answer stands on'),
  age_s: z.number().nullable().describe('Age of that estimate'),
  valid_until: timeSchema.describe(
    'Until when the answer is meant to be used: ask again then, or after a change of mode',
  ),
  stale: z.boolean(),
  quality: z.enum(QUALITIES),
  given: z.string().describe('What every figure takes for granted'),
  limits: limitsSchema,
};

export const quantilesSchema = z
  .object({ p90: z.number(), p50: z.number(), p10: z.number() })
  .describe('Exceeded with 90, 50 and 10 % probability: p90 is the firm figure');

export const headroomQuery = z.strictObject({
  power_MW: hoursQuery.shape.power_MW,
  stale: staleField,
});

export const headroomSchema = z.object({
  ...answerHead,
  answers: z.array(
    z.object({
      power_MW_el: z.number().describe('Charging, at the connection point'),
      hours: quantilesSchema.describe('From the first power on'),
      energy_MWh_el: quantilesSchema.describe('Taken from the grid meanwhile, start-up included'),
      ends_by: z
        .enum(END_CAUSES)
        .nullable()
        .describe(
          'A rule of the outlets or the pressure drop; flow: its greatest flow takes less than the least power. null: nothing within the time looked ahead',
        ),
      first_minutes: firstMinutesSchema,
      derated_after_hours: z
        .number()
        .nullable()
        .describe(
          'From when on, p50, the power needs more than the greatest flow: it takes less then. null: never',
        ),
      derated_to_MW_el: z
        .number()
        .nullable()
        .describe('Least power that it then takes before it ends; null: all that is asked'),
      refused: z.string().nullable().describe('Why it would not run at this power; null: it would'),
      limited_by: z
        .enum(COMMAND_CAUSES)
        .nullable()
        .describe('What keeps it from this power at some time within p10; null: nothing does'),
    }),
  ),
});
