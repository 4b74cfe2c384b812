import { z } from 'zod';
import { rejectedSchema, timeSchema } from './estimate.js';

/** Schemas of what thermocouples are worth. */

const numberOrNull = z.number().nullable();
const modeSchema = z.enum(['charge', 'discharge', 'stand']);

const spreadSchema = z.object({
  soc_sigma_rms: z.number(),
  soc_sigma_worst: z.number(),
  position_sigma_rms_m: numberOrNull.describe('Of fronts wholly in the bed; null where none was'),
  position_sigma_worst_m: numberOrNull,
});

const changed = {
  store: spreadSchema.describe('Of the store, with the change'),
  string: spreadSchema.describe('Of the string that it stands on, with the change'),
  rise: z.number().describe("The store's soc_sigma_rms over that without the change, less 1"),
  most_in: modeSchema.nullable().describe('Mode in which the change tells most'),
};

const storeWorthSchema = z.object({
  store: z.string(),
  all: spreadSchema.describe('With all thermocouples that are in use'),
  sensors: z
    .array(
      z.object({
        id: z.string(),
        string_id: z.string(),
        position_m: z.number(),
        group: z.string().nullable(),
        in_use: z.boolean().describe('false: the change is its repair, not its loss'),
        ...changed,
      }),
    )
    .describe('Those in use first, the most precious first'),
  groups: z.array(
    z.object({
      id: z.string(),
      thermocouples: z.number(),
      strings: z.array(z.string()),
      ...changed,
      string: spreadSchema.nullable().describe('null where it is of several strings'),
    }),
  ),
  strings: z.array(
    z.object({
      id: z.string(),
      radius_m: z.number(),
      thermocouples: z.number(),
      all: spreadSchema.describe('Of the string with all its thermocouples'),
      ...changed,
      one_more: z
        .array(z.object({ position_m: z.number(), ...changed }))
        .describe('One thermocouple more, by its place; empty for the hours ahead'),
    }),
  ),
});

export const unitWorthSchema = z.object({
  unit: z.string(),
  time: timeSchema.nullable().describe('Of the state that the hours ahead begin with'),
  over: z.object({
    kind: z.enum(['day', 'now', 'recording']),
    charge_h: z.number().optional(),
    discharge_h: z.number().optional(),
    stand_h: z.number().optional(),
    mode: modeSchema.optional(),
    hours: z.number().optional(),
  }),
  full_hours: z.number().describe('Hours at rated power from full stores'),
  rejected: z.array(rejectedSchema).describe('Counted as out of use'),
  stores: z.array(storeWorthSchema),
});

export type UnitWorthView = z.output<typeof unitWorthSchema>;
