import { z } from 'zod';
import { IMPLAUSIBLE_KINDS } from '../../../core/track/plausible.js';
import { EVENT_KINDS } from '../../../core/watch/event.js';
import { FAULT_CODES } from '../faults.js';
import {
  dispatchAnswerSchema,
  dispatchSchema,
  estimateSchema,
  profileSchema,
  timeSchema,
} from './estimate.js';
import { limitsSchema } from './limits.js';
import { answerHead } from './plan.js';

/** Schemas of the answers; the types of the views are made from them. */

const storeDefinitionSchema = z.object({
  id: z.string(),
  kind: z.enum(['hot', 'cold']),
  charge_inlet_at: z.enum(['top', 'bottom']),
  length_m: z.number(),
  diameter_m: z.number(),
  reference_hot_degC: z.number(),
  reference_cold_degC: z.number(),
  outlet_limit_degC: z
    .number()
    .nullable()
    .describe('A discharge ends when a hot outlet falls below, a cold outlet rises above this'),
  strings: z.array(
    z.object({
      id: z.string(),
      radius_m: z.number(),
      area_share: z.number(),
      thermocouples: z.array(z.object({ id: z.string(), position_m: z.number() })),
    }),
  ),
});

export const unitDefinitionSchema = z.object({
  unit: z.string(),
  name: z.string(),
  rated_power_MW_el: z.number(),
  rated_hours: z.number(),
  scan_period_s: z.number(),
  hours_at_MW_el: z.array(z.number()),
  stores: z.array(storeDefinitionSchema),
});

const thermocoupleCountsSchema = z
  .object({
    thermocouples: z.number(),
    used: z.number(),
    rejected: z.number().describe('Out of use by a verdict; those of a group_fault are used on'),
    left_out: z.number().describe('Read, without a verdict, and not taken in: in doubt for now'),
    missing: z.number().describe('Without a reading and without a verdict'),
  })
  .describe('Each thermocouple once: used + rejected + left_out + missing are all');

const scanCountsSchema = z.object({
  stores: z.record(z.string(), thermocoupleCountsSchema),
  surprise: z
    .record(z.string(), z.number())
    .describe(
      'By store, mean square of innovations over what was expected, lately; 1 = as expected',
    ),
  implausible: z
    .array(z.object({ channel: z.string(), kind: z.enum(IMPLAUSIBLE_KINDS) }))
    .describe(
      'Readings that no plant produces: not used, and the quality is no better than degraded',
    ),
  mode_disagrees: z.boolean().describe('Mode as told and flow as metered contradict each other'),
  mode_disagreements: z.number().describe('Scans in which they did, kept over a restart'),
});

/** The moving part of a unit: what the live stream sends. */
export const unitStateSchema = z.object({
  unit: z.string(),
  estimate: estimateSchema.nullable(),
  dispatch: dispatchSchema.nullable(),
  age_s: z.number().nullable().describe('Age of the newest reading [s]; null before the first'),
  stale: z.boolean(),
  counts: scanCountsSchema
    .nullable()
    .describe('What of the newest scan was used; null before the first of this process'),
  flow_kg_s: z.number().nullable().describe('Positive while charging'),
  power_MW_el: z
    .number()
    .nullable()
    .describe('Net at the connection point, positive while charging'),
});

export const unitNowSchema = unitStateSchema.extend({
  definition: unitDefinitionSchema.extend({ limits: limitsSchema }),
});
export const streamStateSchema = unitStateSchema.extend({ profile: profileSchema.nullable() });

const firmSchema = z.object({
  time: timeSchema.describe('Of the estimate that it stands on'),
  power_MW: z.number().describe('Rated power where it is in hours_at, else the first there'),
  hours: z.number().describe('p90: exceeded with 90 % probability'),
  energy_MWh_el: z.number().describe('p90, at the connection point'),
  limited_by: dispatchAnswerSchema.shape.limited_by,
});

export const unitListSchema = z.object({
  site: z.string(),
  version: z.string(),
  units: z.array(
    z.object({
      unit: z.string(),
      name: z.string(),
      mode: z.enum(['charge', 'discharge', 'stand']).nullable(),
      quality: z.string().nullable(),
      state_of_charge: z.number().nullable(),
      time: timeSchema.nullable(),
      age_s: z.number().nullable(),
      stale: z.boolean(),
      flow_kg_s: z.number().nullable().describe('Positive while charging'),
      power_MW_el: z
        .number()
        .nullable()
        .describe('Net at the connection point, positive while charging'),
      dispatchable: firmSchema.nullable().describe('What it can still give; null before the first'),
      headroom: firmSchema
        .nullable()
        .describe('What it can still take; null where it was not computed in this process yet'),
      alarms: z
        .object({ high: z.number(), medium: z.number(), low: z.number() })
        .describe('Shown alarms by priority'),
      alerts: z.number().describe('Shown alerts'),
      unacknowledged: z.number().describe('Shown alarms and alerts that nobody has acknowledged'),
      held_back: z.number().describe('Shelved, suppressed by design or out of service'),
    }),
  ),
  left_out: z
    .array(
      z.object({
        unit: z.string().describe('Its id, or its place in the file where it has none of its own'),
        name: z.string(),
        faults: z.array(
          z.object({
            path: z.string(),
            line: z.number().nullable(),
            found: z.string(),
            expected: z.string(),
            hint: z.string().nullable(),
          }),
        ),
      }),
    )
    .describe('Units that are not run, as their part of the configuration has faults'),
});

export const unitHoursSchema = z.object({
  ...answerHead,
  answers: dispatchSchema.shape.answers,
});

export const unitHistorySchema = z.object({
  unit: z.string(),
  from: timeSchema,
  to: timeSchema,
  thinned: z.boolean().describe('A row per stretch of time: numbers as means, words as the last'),
  bucket_s: z
    .number()
    .nullable()
    .describe('Length of those stretches, cut at whole multiples of it; null: rows as stored'),
  series: z
    .array(z.string())
    .describe(
      'Of numbers thinned rows also have NAME.min and NAME.max: the extremes of all rows in it',
    ),
  rows: z.array(z.record(z.string(), z.union([z.number(), z.string(), z.null()]))),
});

export const eventFields = {
  id: z.string(),
  unit: z.string(),
  kind: z.enum(EVENT_KINDS),
  class: z.enum(['alarm', 'alert']),
  priority: z.enum(['high', 'medium', 'low']),
  subject: z.string(),
  time: timeSchema,
  value: z.number().nullable(),
  limit: z.number().nullable(),
  message: z.string(),
  act_by: timeSchema
    .optional()
    .describe('Until when the operator can act; absent: not known, or nothing to do for him'),
};

export const watchEventSchema = z.object({
  ...eventFields,
  transition: z.enum(['raised', 'returned']),
});

export const eventsSchema = z.object({
  from: timeSchema,
  to: timeSchema,
  events: z.array(watchEventSchema),
});

export const healthSchema = z.object({
  ok: z.boolean(),
  site: z.string(),
  version: z.string(),
  parts: z.array(z.object({ name: z.string(), ok: z.boolean(), detail: z.string() })),
});

export const countersSchema = z.object({ counters: z.record(z.string(), z.number()) });

export const faultSchema = z.object({
  error: z.object({
    code: z.enum(FAULT_CODES),
    message: z.string(),
    field: z.string().nullable(),
    value: z.unknown(),
    expected: z.string().nullable(),
    others: z
      .array(
        z.object({
          field: z.string().nullable(),
          value: z.unknown(),
          expected: z.string().nullable(),
        }),
      )
      .optional(),
  }),
});

export type { UnitProfileView } from './playback.js';
export type UnitDefinitionView = UnitNowView['definition'];
export type UnitStateView = z.output<typeof unitStateSchema>;
export type UnitNowView = z.output<typeof unitNowSchema>;
export type StreamStateView = z.output<typeof streamStateSchema>;
export type UnitListView = z.output<typeof unitListSchema>;
export type UnitHistoryView = z.output<typeof unitHistorySchema>;
