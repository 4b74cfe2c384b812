import { z } from 'zod';
import { END_CAUSES, FRONT_REASONS, QUALITIES, SENSOR_VERDICTS } from '../../../core/estimate.js';
import { COMMAND_CAUSES } from '../../../core/plan/leg.js';

/** Schemas of an estimate as HTTP shows it: edge units in the keys, numbers finite or null. */

export const timeSchema = z.string().describe('ISO 8601, UTC');
const numberOrNull = z.number().nullable();

export const quantilesSchema = z
  .object({ p90: z.number(), p50: z.number(), p10: z.number() })
  .describe('Exceeded with 90, 50 and 10 % probability; p90 is the firm figure');

export const firstMinutesSchema = z
  .object({
    probability: z
      .number()
      .describe('That more than 0.5 % of the energy of the first quarter of an hour is missing'),
    lacking_MW: z.number().describe('Missing at its most, likeliest'),
    lacking_at_worst_MW: z.number().describe('The same, not exceeded with 90 % probability'),
    minutes: z.number().describe('Until the power asked is had, likeliest'),
    lacking_MWh_el: z.number().describe('Energy missing, likeliest'),
  })
  .optional()
  .describe(
    'What the greatest flow leaves missing of the power while gas that stood is pushed out, 10 minutes at most; absent: nothing that counts, with 90 % probability',
  );

export const dispatchAnswerSchema = z.object({
  power_MW: z.number().describe('Net electrical power at the connection point [MW]'),
  hours: quantilesSchema,
  energy_MWh_el: quantilesSchema,
  ends_by: z.enum(END_CAUSES).describe('The stop rule that ends the discharge'),
  limited_by: z
    .enum(COMMAND_CAUSES)
    .nullable()
    .describe('What keeps the unit from this power at some time within p10; null: nothing does'),
  first_minutes: firstMinutesSchema,
});

export const dispatchSchema = z.object({
  time: timeSchema.describe('Time of the estimate from which the hours were computed'),
  age_s: numberOrNull.describe('Age of that estimate [s]'),
  answers: z.array(dispatchAnswerSchema),
});

const frontSchema = z.object({
  position_m: numberOrNull.describe('Distance of theta = 0.5 from the charge inlet [m]'),
  position_sigma_m: numberOrNull,
  width_m: numberOrNull.describe('Half the distance between the 16 % and 84 % crossings [m]'),
  width_sigma_m: numberOrNull,
});

const stringSchema = z.object({
  id: z.string(),
  flow_factor: z.number().describe('True over metered flow of this stream tube'),
  flow_factor_sigma: z.number(),
  position_m: numberOrNull,
  width_m: numberOrNull,
});

const frontViewSchema = z.object({
  id: z.string(),
  position_m: numberOrNull,
  position_sigma_m: numberOrNull,
  width_m: numberOrNull,
  width_sigma_m: numberOrNull,
  seen: z.boolean(),
  disagreement: numberOrNull.describe('(front view - tube) over the sigma of the difference'),
});

export const rejectedSchema = z.object({
  id: z.string(),
  verdict: z.enum(SENSOR_VERDICTS),
  since: timeSchema,
  evidence: z.string(),
});

export const storeEstimateSchema = z.object({
  soc: z.number(),
  soc_sigma: z.number(),
  stored_MWh_th: z.number(),
  stored_sigma_MWh_th: z.number(),
  fronts: z.array(frontSchema).describe('Ordered by distance from the charge inlet'),
  fronts_reason: z.enum(FRONT_REASONS).nullable().describe('Why there is no front, or null'),
  energy_position_m: z.number(),
  spread_ratio: numberOrNull.describe('Front width over that of a healthy bed, same history'),
  heat_transfer_factor: z.number(),
  heat_transfer_factor_sigma: z.number(),
  strings: z.array(stringSchema),
  front_views: z.array(frontViewSchema),
  sensors: z.object({ used: z.number(), rejected: z.array(rejectedSchema) }),
  outlet_degC: numberOrNull.describe('Gas leaving the store now; null while standing'),
});

export const estimateSchema = z.object({
  time: timeSchema,
  unit: z.string(),
  revision: z.number(),
  mode: z.enum(['charge', 'discharge', 'stand']),
  quality: z.enum(QUALITIES),
  state_of_charge: z.number().describe('Dispatchable over rated energy at rated power'),
  stores: z.record(z.string(), storeEstimateSchema),
});

export const storeProfileSchema = z.object({
  x_m: z.array(z.number()).describe('Cell centres, distance from the charge inlet [m]'),
  mean_degC: z.array(z.number()),
  tubes: z.array(
    z.object({
      id: z.string(),
      temperature_degC: z.array(z.number()),
      sigma_K: z.array(z.number()),
    }),
  ),
  readings: z.array(
    z.object({
      id: z.string(),
      string: z.string(),
      position_m: z.number(),
      value_degC: numberOrNull.describe('null = missing'),
      verdict: z.enum(SENSOR_VERDICTS).nullable().describe('null = used by the estimate'),
    }),
  ),
});

export const profileSchema = z.object({
  time: timeSchema,
  unit: z.string(),
  stores: z.record(z.string(), storeProfileSchema),
});
