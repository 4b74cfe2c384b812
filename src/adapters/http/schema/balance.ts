import { z } from 'zod';
import { END_CAUSES } from '../../../core/estimate.js';
import { FLUSH_WAYS } from '../../../core/plan/flush.js';
import { TRIM_WAYS } from '../../../core/plan/trim.js';
import { USUAL_CHARGES } from '../../../core/plan/usual.js';
import { answerHead, quantilesSchema, staleField } from './plan.js';

function numeral(expected: string, least: (value: number) => boolean) {
  return z
    .string({ error: expected })
    .regex(/^-?\d+(\.\d+)?$/, { error: expected })
    .describe(expected)
    .transform(Number)
    .refine((value) => least(value) && Number.isFinite(value), { error: expected });
}

const above0 = (value: number): boolean => value > 0;
const least0 = (value: number): boolean => value >= 0;

export const balanceQuery = z
  .strictObject({
    power_MW: numeral('a power in MW above 0, of the discharge', above0).optional(),
    charge_MWh_el: numeral('MWh_el above 0 that a usual charge takes', above0).optional(),
    price_per_MWh_el: numeral('a price of energy given, 0 or more', least0).optional(),
    charging_price_per_MWh_el: numeral(
      'a price of energy taken, of any sign',
      () => true,
    ).optional(),
    stale: staleField,
  })
  .refine(
    (query) =>
      query.charging_price_per_MWh_el === undefined || query.price_per_MWh_el !== undefined,
    { error: 'price_per_MWh_el beside it', path: ['charging_price_per_MWh_el'] },
  );

const endsBy = z.enum(END_CAUSES).nullable();
const runSchema = z.object({
  hours: z.number(),
  energy_MWh_el: z.number(),
  ends_by: endsBy.describe('null: it took what is usual'),
});
const perStore = z.record(z.string(), z.number());
const hoursAlone = z.object({ hours: quantilesSchema, ends_by: z.enum(END_CAUSES) });

const flushSchema = z.object({
  as_usual: z.object({
    runs: z.array(runSchema).describe('Charged as far as is usual, then discharged to a rule'),
    following_MWh_el: z.array(z.number()).describe('Given by each usual cycle that follows'),
    round_trip: z.number().describe('MWh_el given per MWh_el taken in the last of these'),
  }),
  ways: z.array(
    z.object({
      way: z.enum(FLUSH_WAYS),
      reason: z.string().nullable().describe('Why it is no flush; null: it is one'),
      runs: z.array(runSchema),
      takes_MWh_el: z.number().describe('Against as usual, until empty; below 0 = less'),
      gives_MWh_el: z.number(),
      takes_hours: z.number(),
      cost_MWh_el: z
        .number()
        .describe('What the energy taken would have given in a usual cycle, less what it gave'),
      gains_MWh_el: z
        .array(z.number())
        .describe('More given by each following cycle from the same usual charge'),
      pays_after_cycles: z
        .number()
        .nullable()
        .describe(
          'Where there are prices, in money with the lost time, else in MWh_el; null: not within those marched',
        ),
      money: z
        .object({
          energy_cost: z.number(),
          lost_time_cost: z
            .number()
            .describe('What usual cycles would have earned in the hours it takes more'),
          gains: z.array(z.number()),
        })
        .nullable()
        .describe('In the currency of the prices asked with; null without'),
    }),
  ),
});

const mismatchSchema = z.object({
  power_MW_el: z.number(),
  together: hoursAlone,
  alone: z
    .record(z.string(), hoursAlone)
    .describe("Each store as if alone: the other's rule left out, its gas as if it stayed charged"),
  mismatch_h: z
    .number()
    .describe('Hot less cold, each run to its own rule: above 0 the hot store holds more'),
  ends_first: z.string().nullable().describe('The store that ends a discharge; null: they match'),
  stranded: z
    .object({
      store: z.string(),
      remains_MWh_th: z.number().describe('Above its discharged reference when the other ends'),
      stranded_MWh_th: z.number().describe('Of it, what it would give on to its own rule'),
      worth_MWh_el: z.number().describe('What that would give if the other matched it'),
    })
    .nullable(),
  drift: z.object({
    after_charge_h: z.array(z.number()),
    per_cycle_h: z.number(),
    per_cycle_MWh_th: z.number(),
  }),
  trims: z.array(
    z.object({
      way: z.enum(TRIM_WAYS),
      reason: z.string().nullable().describe('Why it is not to be had; null: it is'),
      hours: z.number(),
      mismatch_before_h: z.number(),
      mismatch_after_h: z.number(),
      takes_MWh_el: z.number(),
      gives_MWh_el: z.number(),
      cost_MWh_el: z.number(),
      lost_MWh_th: perStore,
      past_rule: endsBy.describe('The stop rule that is run past: the plant has to allow it'),
      outlet_degC: z.number().nullable().describe("That store's outlet in the end"),
    }),
  ),
});

export const balanceSchema = z.object({
  ...answerHead,
  usual: z.object({
    charge_MWh_el: z.number(),
    charge_from: z.enum(USUAL_CHARGES),
    charging_MW_el: z.number(),
    discharging_MW_el: z.number(),
    full_charge: runSchema,
    full_discharge: runSchema,
    round_trip: z.number(),
    locked: z
      .boolean()
      .describe("Present beds can neither be charged nor discharged: this cycle is the model's"),
  }),
  flush: flushSchema,
  mismatch: mismatchSchema.nullable(),
  mismatch_reason: z.string().nullable().describe('Why there is none; null: two stores'),
});
