import { z } from 'zod';

/** Schema of what binds what the unit can sell, beside its stores. */

const iso = z.string().describe('ISO 8601, UTC');

const direction = z.object({
  power_min_MW_el: z.number().describe('Least power that can be held; 0: any'),
  power_max_MW_el: z.number(),
  flow_min_kg_s: z.number(),
  flow_max_kg_s: z.number(),
  ramp_MW_per_min: z.number().nullable().describe('null: at once'),
});

const startUp = z.object({
  time_min: z.number().describe('From the command to the first power'),
  energy_kWh_el: z.number().describe('Drawn meanwhile, standing auxiliaries included'),
});

const let_through = {
  export_max_MW_el: z.number(),
  import_max_MW_el: z.number(),
};

export const limitsSchema = z
  .object({
    charge: direction,
    discharge: direction,
    start: z
      .object({
        warm: startUp,
        cold: startUp,
        cold_after_h: z.number().nullable().describe('Stood longer, it starts cold; null: never'),
      })
      .nullable()
      .describe('null: none is configured, the unit runs at once'),
    change_over_min: z.number().describe('Between the directions, before the start-up'),
    connection: z
      .object({
        time_zone: z.string().describe('IANA name; blocks are written in it'),
        now: z.object(let_through),
        next_change: z
          .object({ time: iso, ...let_through })
          .nullable()
          .describe('null: none within two days'),
      })
      .nullable()
      .describe('As of the time of the answer; null: none is configured, no limit'),
    outages: z
      .array(
        z.object({
          from: iso,
          to: iso,
          discharge_max_MW_el: z.number(),
          charge_max_MW_el: z.number(),
          reason: z.string(),
        }),
      )
      .describe('Planned, standing or beginning within two days'),
    auxiliaries_running_MW_el: z.number().describe('In the net powers already'),
    auxiliaries_standing_MW_el: z.number().describe('Drawn from the grid while standing'),
    availability: z
      .number()
      .nullable()
      .describe(
        'Share of the time, planned outages aside, in which the machine runs when called; in no figure',
      ),
  })
  .describe('What binds beside the stores');

export type LimitsView = z.output<typeof limitsSchema>;
