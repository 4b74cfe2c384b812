import { z } from 'zod';

/**
 * Schemas of what a client may ask. The message of each check is the sentence that follows
 * "expected" in the answer; unknown keys are refused, so that a slip of the pen is not taken for
 * a default.
 */
export const MOST_POWERS = 8;
export const GREATEST_POWER_MW = 10_000;
export const MOST_POINTS = 5_000;
export const MOST_EVENTS = 1_000;

export const unitName = z.string().min(1, { error: 'the id of a unit' });

export const unitParams = z.strictObject({ unit: unitName });

const POWERS = `1 to ${MOST_POWERS} powers in MW, each above 0 and at most ${GREATEST_POWER_MW}, separated by commas, as in 1.2,1.8`;

// Plain decimals only: Number() would also take '', '0x10' and ' 1 '.
const DECIMAL = /^\+?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?$/i;

export const hoursQuery = z.strictObject({
  power_MW: z
    .string({ error: POWERS })
    .describe(POWERS)
    .transform((text, context) => {
      const parts = text.split(',').map((part) => part.trim());
      const powers = parts.map((part) => (DECIMAL.test(part) ? Number(part) : Number.NaN));
      const sound = powers.every((power) => power > 0 && power <= GREATEST_POWER_MW);
      if (!sound || powers.length > MOST_POWERS) {
        context.addIssue({ code: 'custom', message: POWERS });
        return z.NEVER;
      }
      return powers;
    }),
});

const OVER = 'now or day';

export const sensorsQuery = z.strictObject({
  over: z
    .enum(['now', 'day'], { error: OVER })
    .describe('The hours ahead of the present state (default), or a settled day')
    .optional(),
});

const INSTANT = 'a time in ISO 8601 with offset, as in 2026-01-31T06:00:00Z';
export const instant = z.iso
  .datetime({ offset: true, error: INSTANT })
  .describe(INSTANT)
  .transform((text) => Date.parse(text))
  .refine(Number.isFinite, { error: INSTANT });

export function count(most: number) {
  const expected = `a whole number from 1 to ${most}`;
  return z
    .string({ error: expected })
    .regex(/^\d{1,9}$/, { error: expected })
    .describe(expected)
    .transform(Number)
    .refine((value) => value >= 1 && value <= most, { error: expected });
}

const SERIES = 'names of series, separated by commas';

export const historyQuery = z.strictObject({
  from: instant.optional(),
  to: instant.optional(),
  series: z
    .string({ error: SERIES })
    .min(1, { error: SERIES })
    .describe(SERIES)
    .transform((text) => text.split(',').map((name) => name.trim()))
    .optional(),
  points: count(MOST_POINTS).optional(),
  format: z
    .enum(['json', 'csv'], { error: 'json or csv' })
    .describe('json or csv; without it the Accept header decides')
    .optional(),
});

const RUN = 'charge, stand or discharge';

export const cyclesQuery = z.strictObject({
  from: instant.optional(),
  to: instant.optional(),
  kind: z.enum(['charge', 'stand', 'discharge'], { error: RUN }).describe(RUN).optional(),
  indicators: z
    .enum(['yes', 'no'], { error: 'yes or no' })
    .describe('no leaves the indicators of each run empty (default: yes)')
    .optional(),
  format: z
    .enum(['json', 'csv'], { error: 'json or csv' })
    .describe('json or csv; without it the Accept header decides')
    .optional(),
});

export const reportQuery = z.strictObject({
  from: instant.optional(),
  to: instant.optional(),
  format: z.enum(['html', 'json', 'csv'], { error: 'html, json or csv' }).optional(),
  table: z
    .enum(['runs', 'findings', 'indicators', 'thermocouples', 'events'], {
      error: 'runs, findings, indicators, thermocouples or events',
    })
    .describe('of csv')
    .optional(),
});

export const eventsQuery = z.strictObject({
  unit: unitName.optional(),
  from: instant.optional(),
  to: instant.optional(),
  most: count(MOST_EVENTS).optional(),
});

export const streamQuery = z.strictObject({
  profile: unitName
    .describe('Unit whose temperature profile is sent along with its states')
    .optional(),
  last_event_id: z
    .string()
    .max(100, { error: 'an id that the stream has sent' })
    .describe('Stands in for the header Last-Event-ID where a client cannot set it')
    .optional(),
});

/**
 * For the message about an unknown key.
 *
 * @param schema of a part of a question; of a body that may be of several kinds its JSON counts
 * @param path from there to the object that has the key
 */
export function keysOf(schema: unknown, path: readonly string[] = []): string[] {
  const json = (schema as { content?: Record<string, { schema?: unknown }> } | undefined)
    ?.content?.['application/json']?.schema;
  let at: unknown = json ?? schema;
  for (const key of path) {
    at = unwrapped(at);
    if (at instanceof z.ZodArray) at = at.element;
    else at = at instanceof z.ZodObject ? at.shape[key] : undefined;
  }
  at = unwrapped(at);
  return at instanceof z.ZodObject ? Object.keys(at.shape) : [];
}

function unwrapped(schema: unknown): unknown {
  let at = schema;
  while (at instanceof z.ZodOptional || at instanceof z.ZodNullable || at instanceof z.ZodDefault) {
    at = at.unwrap();
  }
  return at;
}
