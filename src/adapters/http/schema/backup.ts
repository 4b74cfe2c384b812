import { z } from 'zod';
import { timeSchema } from './estimate.js';

export const restoreQuery = z.strictObject({
  who: z
    .string('expected a name')
    .trim()
    .min(1, 'expected a name')
    .max(60, 'expected a name of at most 60 characters')
    .optional()
    .describe('Whose word it is: recorded, behind the name of the token where one came along'),
});

export const restoreSchema = z.object({
  unit: z.string(),
  state_of: timeSchema.describe('Source time of the state that it was put back to'),
  who: z.string(),
  from: timeSchema,
  to: timeSchema.describe('First and last scan that was made again since'),
  scans: z.number().int(),
  revised: z.number().int().describe('Estimates that have changed'),
  same_shape: z
    .boolean()
    .describe('false: the definition is another one, the state was carried over'),
  reaches: z.boolean().describe('The journal had every reading since; else a gap was aged'),
  anew: z.array(z.string()).describe('Stores whose beds are begun anew'),
  lost: z
    .array(z.string())
    .describe('INDICATOR/SUBJECT of what was learned as healthy and is learned anew'),
});

export const readySchema = z.object({
  ready: z.boolean(),
  reasons: z.array(z.string()).optional().describe('Why not; only for whoever may look'),
});
