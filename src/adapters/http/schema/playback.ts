import { z } from 'zod';
import { INDICATOR_KINDS, type IndicatorKind } from '../../../core/watch/indicator.js';
import { estimateSchema, storeProfileSchema, timeSchema } from './estimate.js';
import { count, instant } from './questions.js';

/** Schemas of what was stored and is looked at again: profiles, and what indicators showed. */

export const MOST_PROFILES = 200;
export const MOST_WATCH_POINTS = 1000;

const SIGMA = 'yes or no';

export const profileQuery = z.strictObject({
  time: instant
    .describe('The stored profile at or before this time; without it the newest')
    .optional(),
});

export const profilesQuery = z.strictObject({
  from: instant.optional(),
  to: instant.optional(),
  points: count(MOST_PROFILES).optional(),
  sigma: z
    .enum(['yes', 'no'], { error: SIGMA })
    .describe('no leaves sigma_K of the tubes out (default: yes)')
    .optional(),
});

const KINDS = `some of ${INDICATOR_KINDS.join(', ')}, separated by commas`;

function isKind(text: string): text is IndicatorKind {
  return (INDICATOR_KINDS as readonly string[]).includes(text);
}

export const watchHistoryQuery = z.strictObject({
  from: instant.optional(),
  to: instant.optional(),
  points: count(MOST_WATCH_POINTS).optional(),
  kinds: z
    .string({ error: KINDS })
    .describe(KINDS)
    .transform((text, context) => {
      const kinds = text.split(',').map((kind) => kind.trim());
      if (kinds.every(isKind)) return kinds;
      context.addIssue({ code: 'custom', message: KINDS });
      return z.NEVER;
    })
    .optional(),
});

const numberOrNull = z.number().nullable();

/** What goes with a profile, so that a page draws a moment of the past as it draws the present. */
const momentFields = {
  estimate: estimateSchema
    .nullable()
    .describe('The estimate nearest in time; null: none within a quarter of an hour'),
  flow_kg_s: numberOrNull.describe('Positive while charging'),
  power_MW_el: numberOrNull.describe('Net at the connection point, positive while charging'),
};

export const unitProfileSchema = z.object({
  time: timeSchema,
  unit: z.string(),
  stores: z.record(z.string(), storeProfileSchema),
  ...momentFields,
  age_s: numberOrNull,
});

const playedStoreSchema = storeProfileSchema.extend({
  tubes: z.array(storeProfileSchema.shape.tubes.element.partial({ sigma_K: true })),
});

export const playbackSchema = z.object({
  unit: z.string(),
  from: timeSchema,
  to: timeSchema,
  thinned: z.boolean().describe('More are stored than are given'),
  every_s: z
    .number()
    .describe('Usual spacing of the profiles given: two that lie further apart have a gap between'),
  profiles: z
    .array(
      z.object({
        time: timeSchema,
        unit: z.string(),
        stores: z.record(z.string(), playedStoreSchema),
        ...momentFields,
      }),
    )
    .describe('Oldest first'),
});

const column = z.array(numberOrNull);

export const watchHistorySchema = z.object({
  unit: z.string(),
  from: timeSchema,
  to: timeSchema,
  thinned: z.boolean().describe('More is stored than is given'),
  every_s: z.number().describe('Usual spacing: times further apart have a gap between'),
  times: z.array(timeSchema).describe('Oldest first; each column has an entry for each'),
  indicators: z.array(
    z.object({
      kind: z.enum(INDICATOR_KINDS),
      subject: z.string().describe('Store, STORE/STRING, channel or unit'),
      unit: z.string().describe('Of value, sigma, healthy, limit and deadband'),
      value: column,
      sigma: column,
      healthy: column,
      limit: column,
      deadband: column,
      score: column.describe('Sequential test: 0 as healthy as can be, 1 decided'),
      state: z.array(z.enum(['normal', 'degraded', 'undetermined']).nullable()),
    }),
  ),
});

export type UnitProfileView = z.output<typeof unitProfileSchema>;
export type PlaybackView = z.output<typeof playbackSchema>;
export type PlayedProfileView = PlaybackView['profiles'][number];
export type WatchHistoryView = z.output<typeof watchHistorySchema>;
