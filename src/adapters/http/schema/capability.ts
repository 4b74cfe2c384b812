import { z } from 'zod';
import { END_CAUSES } from '../../../core/estimate.js';
import { POWER_LIMITS } from '../../../core/plan/greatest.js';
import { answerHead, staleField } from './plan.js';
import { historyQuery } from './questions.js';

const TOLERANCE = 'a share of rated power from 0.0005 to 0.2, as in 0.01';

export const capabilityQuery = z.strictObject({
  tolerance: z
    .string({ error: TOLERANCE })
    .regex(/^\d+(\.\d+)?$/, { error: TOLERANCE })
    .describe(`Largest error of the curves: ${TOLERANCE} (default)`)
    .transform(Number)
    .refine((value) => value >= 0.0005 && value <= 0.2, { error: TOLERANCE })
    .optional(),
  format: historyQuery.shape.format,
  stale: staleField,
});

const perStore = z.record(z.string(), z.number());

const curveSchema = z.object({
  direction: z.enum(['charge', 'discharge']),
  marched_at_MW_el: z.number().describe('Power that the beds were marched with'),
  after_cycles: z
    .number()
    .nullable()
    .describe(
      '0: from the present beds; n: these hardly reach anywhere, so from the n-th cycle; null: they cannot be moved, so from a settled cycle of the model',
    ),
  points: z
    .array(
      z.object({
        state_of_charge: z.number().describe('As the unit publishes it'),
        power_MW_el: z.number().describe('Greatest net power at the connection point'),
        limited_by: z.enum(POWER_LIMITS),
        energy_MWh_el: z
          .number()
          .describe('Given from here to empty at rated power; or taken from here to full'),
        stored_MWh_th: perStore.describe('Above the discharged reference, by store'),
      }),
    )
    .describe('Straight lines between them; a discharge stops at 0, a charge at the last point'),
  largest_error_MW_el: z.number().describe('Of the lines, against every step of the march'),
  tolerance_MW_el: z.number(),
  steps: z.number().describe('Steps of the march'),
  ends_by: z.enum(END_CAUSES).nullable().describe('null: nothing within the time looked ahead'),
  beyond_MWh_el: z
    .number()
    .describe('Still given below rated power once the state of charge is 0; 0 while charging'),
  refused: z.string().nullable().describe('Why it cannot run in this direction; null: it can'),
});

export const capabilitySchema = z.object({
  ...answerHead,
  state_of_charge: z.number(),
  full_from_now: z.number().describe('State of charge that a charge from now ends at'),
  rated_power_MW_el: z.number(),
  rated_hours: z.number(),
  discharge: curveSchema,
  charge: curveSchema,
  cycle: z
    .object({
      cycles: z.number().describe('Cycles marched from limit to limit'),
      settled: z.boolean().describe('The last repeated the one before'),
      full_state_of_charge: z.number(),
      charge_MWh_el: z.number(),
      discharge_MWh_el: z.number(),
      round_trip: z.number().describe('MWh_el given per MWh_el taken'),
      charge_MWh_el_per_MWh_th: perStore,
      discharge_MWh_el_per_MWh_th: perStore,
    })
    .nullable()
    .describe('The last of these cycles; null where a direction is refused'),
});
