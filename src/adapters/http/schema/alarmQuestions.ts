import { z } from 'zod';
import { LEAST_SHELF_H, MOST_WHO, MOST_WHY } from '../../../core/alarm/command.js';
import { count, instant, MOST_EVENTS, unitName } from './questions.js';

/** Schemas of what may be asked of alarms, and done to them. */
export const alarmsQuery = z.strictObject({ unit: unitName.optional() });

export const figuresQuery = z.strictObject({
  unit: unitName.optional(),
  from: instant.optional(),
  to: instant.optional(),
});

const EVENT_ID = 'the id of an alarm or alert';
const WHO = `a name of 1 to ${MOST_WHO} characters`;
const WHY = `the reason, 1 to ${MOST_WHY} characters`;
const HOURS = 'a number of hours from 1/60 (a minute) to alarms.shelve_most_h of the configuration';

const id = z
  .string({ error: EVENT_ID })
  .min(1, { error: EVENT_ID })
  .max(300, { error: EVENT_ID })
  .describe(`${EVENT_ID}, UNIT/KIND/SUBJECT`);
const who = z
  .string({ error: WHO })
  .trim()
  .regex(new RegExp(`^[^\\p{Cc}]{1,${MOST_WHO}}$`, 'u'), { error: WHO })
  .describe('Whose word it is: recorded');
const why = z
  .string({ error: WHY })
  .trim()
  .regex(new RegExp(`^[^\\p{Cc}]{1,${MOST_WHY}}$`, 'u'), { error: WHY })
  .describe('The reason: recorded');

export const transitionsQuery = figuresQuery.extend({
  id: id.optional(),
  most: count(MOST_EVENTS).optional(),
});

export const acknowledgeBody = z.strictObject(
  { id, who, why: why.optional() },
  { error: 'an object {"id": ..., "who": ...}' },
);

export const shelveBody = z.strictObject(
  {
    id,
    who,
    why,
    hours: z.number({ error: HOURS }).min(LEAST_SHELF_H, { error: HOURS }).describe(HOURS),
  },
  { error: 'an object {"id": ..., "who": ..., "hours": ..., "why": ...}' },
);

export const outOfServiceBody = z.strictObject(
  { id, who, why },
  { error: 'an object {"id": ..., "who": ..., "why": ...}' },
);
