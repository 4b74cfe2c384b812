import { z } from 'zod';
import { EVENT_KINDS } from '../../../core/watch/event.js';
import { timeSchema } from './estimate.js';
import { instant } from './questions.js';

export const rewindsQuery = z.strictObject({ from: instant.optional(), to: instant.optional() });

export const rewindsSchema = z.object({
  unit: z.string(),
  from: timeSchema,
  to: timeSchema,
  older_left_out: z.boolean(),
  rewinds: z
    .array(
      z.object({
        unit: z.string(),
        done: timeSchema.describe("By this machine's clock"),
        from: timeSchema.describe('Source time of the first scan that was made again'),
        to: timeSchema,
        scans: z.number(),
        late_used: z.number().describe('Late readings that are in their scans since'),
        revised: z.number().describe('Estimates that changed'),
        revision: z.number().describe('The greatest that an estimate of these scans has since'),
        differences: z
          .array(
            z.object({
              id: z.string(),
              kind: z.enum(EVENT_KINDS),
              transition: z.enum(['raised', 'returned']),
              time: timeSchema,
              told: z
                .boolean()
                .describe('true: told, and did not happen; false: not told, and did'),
            }),
          )
          .describe('Alarms and alerts of the past that are otherwise by the late readings'),
        differences_left_out: z.number(),
        restored: z
          .object({ state_of: timeSchema, who: z.string() })
          .optional()
          .describe('Where the unit was put back to a backup'),
        remade: z
          .object({
            estimates: z.number(),
            afresh: z.boolean().describe('No state was left: of an estimator begun anew'),
          })
          .optional()
          .describe('Where a damaged history had lost estimates: how many are there again'),
      }),
    )
    .describe('Newest first'),
});
