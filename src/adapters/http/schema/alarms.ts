import { z } from 'zod';
import { ALARM_ACTIONS } from '../../../core/alarm/command.js';
import { ALARM_STATES } from '../../../core/alarm/state.js';
import { TRANSITION_KINDS } from '../../../core/alarm/step.js';
import { EVENT_KINDS } from '../../../core/watch/event.js';
import { eventFields } from './answers.js';
import { timeSchema } from './estimate.js';

/** Schemas of the answers about alarms. */

const stateSchema = z.enum(ALARM_STATES);

export const alarmEntrySchema = z.object({
  ...eventFields,
  state: stateSchema.describe('After ISA-18.2 and IEC 62682'),
  letter: z.string().describe("Letter of the state in the standard's diagram, A to I"),
  active: z.boolean().describe('The condition stands, be it shown or held back'),
  since: timeSchema.describe('In this state since'),
  acknowledged_by: z.string().nullable(),
  shelved: z.object({ by: z.string(), why: z.string(), until: timeSchema }).nullable(),
  out_of_service: z.object({ by: z.string(), why: z.string() }).nullable(),
  cause: z.string(),
  consequence: z.string().describe('What follows where nobody acts'),
  action: z.string().describe('What to do; an alarm wants the operator to'),
  respond_within_h: z.number().describe('Time within which acting still helps [h]'),
});

export const alarmsSchema = z.object({
  standing: z
    .array(alarmEntrySchema)
    .describe('Shown: stands, or has returned unacknowledged or latched; the urgent first'),
  suppressed: z
    .array(alarmEntrySchema)
    .describe('Held back: shelved, suppressed by design or out of service'),
  counts: z.record(z.string(), z.number()).describe('How many there are of each state'),
  shelve_most_h: z.number().describe('Longest time for which one may be shelved [h]'),
});

export const commandedSchema = z.object({
  id: z.string(),
  action: z.enum(ALARM_ACTIONS),
  who: z.string(),
  state: stateSchema,
  alarm: alarmEntrySchema.nullable().describe('null where it has left the list by it'),
});

/** The older form of the answer to an acknowledgement, with what all commands tell. */
export const acknowledgedSchema = commandedSchema.extend({
  acknowledged_by: z.string(),
  standing: alarmEntrySchema.nullable().describe('null once it has returned and left the list'),
});

export const transitionsSchema = z.object({
  from: timeSchema,
  to: timeSchema,
  transitions: z.array(
    z.object({
      id: z.string(),
      unit: z.string(),
      kind: z.enum(EVENT_KINDS),
      time: timeSchema,
      what: z.enum(TRANSITION_KINDS),
      before: stateSchema.nullable().describe('null where an older version kept none'),
      after: stateSchema.nullable(),
      who: z.string().nullable().describe('null: the condition, a rule or the time'),
      why: z.string(),
    }),
  ),
});

export const figuresSchema = z.object({
  unit: z.string().nullable(),
  from: timeSchema,
  to: timeSchema,
  annunciated: z.number().describe('Alarms shown as unacknowledged in the span'),
  by_priority: z.object({ high: z.number(), medium: z.number(), low: z.number() }).nullable(),
  per_10_min: z.number(),
  per_day: z.number(),
  most_in_10_min: z.number(),
  floods: z
    .array(
      z.object({
        from: timeSchema,
        to: timeSchema.nullable().describe('null: not over at the end of the span'),
        count: z.number(),
        most_in_10_min: z.number(),
      }),
    )
    .describe('From more than ten in ten minutes until fewer than five in ten minutes'),
  share_in_flood: z.number().describe('Share of the span'),
  chattering: z
    .array(z.object({ id: z.string(), most_in_a_minute: z.number() }))
    .describe('The same alarm three times or more in a minute'),
  stale: z
    .array(z.object({ id: z.string(), hours: z.number() }))
    .describe('Alarms that stand now, and stood for more than 24 h at the end of the span'),
  most_frequent: z
    .array(z.object({ id: z.string(), count: z.number(), share: z.number() }))
    .describe('The ten most frequent'),
  share_of_most_frequent: z.number().nullable(),
  alerts: z.number().describe('Alerts shown in the span: no load on the operator'),
  held_back: z.object({
    shelved: z.number(),
    suppressed_by_design: z.number(),
    out_of_service: z.number(),
  }),
});
