import { z } from 'zod';
import { CAUSE_KINDS } from '../../../core/watch/causes.js';
import { INDICATOR_KINDS, INDICATOR_REASONS } from '../../../core/watch/indicator.js';
import { timeSchema } from './estimate.js';

/** Schemas of what indicators show and of the cycle log. */

const numberOrNull = z.number().nullable();

export const indicatorSchema = z.object({
  kind: z.enum(INDICATOR_KINDS),
  subject: z.string().describe('Store, STORE/STRING, channel or unit'),
  value: numberOrNull,
  sigma: numberOrNull,
  unit: z.string().describe('Of value, sigma, healthy, limit and deadband'),
  healthy: numberOrNull,
  healthy_from: z.enum(['configured', 'learned', 'twin', 'law']).nullable(),
  limit: z.number(),
  deadband: z.number(),
  on_delay_s: z.number(),
  off_delay_s: z.number(),
  score: numberOrNull.describe('Sequential test: 0 as healthy as can be, 1 decided'),
  state: z.enum(['normal', 'degraded', 'undetermined']),
  reason: z.enum(INDICATOR_REASONS).nullable().describe('Why it is undetermined'),
  time: timeSchema.nullable(),
  sentence: z.string(),
  only_while_cold: z
    .boolean()
    .nullable()
    .optional()
    .describe('Of pressure_drop: too high only while the bed is below freezing; null: not known'),
});

const causeSchema = z.object({
  cause: z.enum(CAUSE_KINDS),
  subject: z.string(),
  probability: z.number(),
  evidence: z.array(z.string()),
  check: z.string().describe('What to look at on site'),
});

export const watchSchema = z.object({
  time: timeSchema,
  unit: z.string(),
  age_s: numberOrNull,
  stale: z.boolean(),
  indicators: z.array(indicatorSchema),
  causes: z.array(causeSchema).describe('Probable ones; empty while nothing is degraded'),
});

const storeRunSchema = z.object({
  soc_from: z.number(),
  soc_to: z.number(),
  stored_from_MWh_th: z.number(),
  stored_to_MWh_th: z.number(),
  stored_sigma_MWh_th: z.number(),
  carried_MWh_th: numberOrNull.describe('Brought by the gas, below 0 = taken; null without flow'),
  lost_MWh_th: numberOrNull.describe('Brought less stored; of a stand what was lost'),
  lost_sigma_MWh_th: numberOrNull.describe('Of a stand; null else'),
  outlet_from_degC: numberOrNull,
  outlet_to_degC: numberOrNull,
  hottest_degC: numberOrNull,
  coldest_degC: numberOrNull,
  heat_transfer_factor: z.number(),
  heat_transfer_factor_sigma: z.number(),
  flow_factors: z.record(z.string(), z.number()),
  thermocouples_rejected: z.number(),
  widths: z.array(
    z.object({
      place_m: z.number(),
      share: z.number().describe('The place as a share of the length'),
      width_m: numberOrNull,
      width_sigma_m: numberOrNull,
      spread_ratio: numberOrNull,
    }),
  ),
});

const runKind = z.enum(['charge', 'stand', 'discharge']);

const cycleSchema = z.object({
  unit: z.string(),
  no: z.number(),
  kind: runKind,
  from: timeSchema,
  to: timeSchema,
  incomplete: z.array(z.enum(['began_before', 'gap', 'flow_unknown', 'power_unknown'])),
  running_h: z.number(),
  drawn_MWh_el: numberOrNull,
  delivered_MWh_el: numberOrNull,
  power_most_MW_el: numberOrNull,
  flow_mean_kg_s: numberOrNull,
  soc_from: numberOrNull,
  soc_to: numberOrNull,
  ambient_mean_degC: z.number(),
  stores: z.record(z.string(), storeRunSchema),
  raised: z.array(z.string()).describe('Ids of alarms and alerts raised within it'),
  round_trip: numberOrNull,
  round_trip_over: z
    .object({
      from: timeSchema,
      drawn_MWh_el: z.number(),
      delivered_MWh_el: z.number(),
      soc_left: z.record(z.string(), z.number()),
    })
    .nullable(),
  told: z
    .object({
      made: timeSchema,
      power_MW_el: z.number(),
      end: timeSchema.describe('By p50'),
      firm_end: timeSchema.describe('By p90: not before, with 90 % probability'),
    })
    .nullable()
    .describe('When a discharge was to end, as told at its begin'),
  indicators: z.array(indicatorSchema),
});

export const cyclesSchema = z.object({
  unit: z.string(),
  from: timeSchema,
  to: timeSchema,
  older_left_out: z.boolean(),
  cycles: z.array(cycleSchema).describe('Oldest first'),
});
