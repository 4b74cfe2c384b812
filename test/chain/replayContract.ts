import { z } from 'zod';

/**
 * The contract of `rockhour replay`, written from DESIGN.md, section 6, alone, with the closed lists
 * as README.md documents them. Required keys are required and no other key is let pass, but for
 * those that rockhour has beyond the contract, listed in ADDITIONAL.
 */
export const ADDITIONAL = {
  store: ['front_views', 'outlet_K'],
  rejected: ['evidence'],
} as const;

const isoUtc = z.string().regex(/^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d(\.\d+)?Z$/);
/** zod's number is finite: NaN and infinities, which JSON has not, are refused. */
const finite = z.number();
const finiteOrNull = finite.nullable();
const sigma = finite.min(0);
const share = finite;

const additional = (names: readonly string[]) =>
  Object.fromEntries(names.map((name) => [name, z.unknown()]));

const front = z.strictObject({
  position_m: finiteOrNull,
  position_sigma_m: sigma.nullable(),
  width_m: finite.min(0).nullable(),
  width_sigma_m: sigma.nullable(),
});

const VERDICTS = 'open burst stuck drifting offset reversed outlier group_fault uncovered'.split(
  ' ',
);
const KINDS = (
  'front_spread sensor_rejected data_stale outlet_near_limit front_view_disagrees ' +
  'gas_temperature_off database_unreachable'
).split(' ');

const store = z.strictObject({
  soc: share,
  soc_sigma: sigma,
  stored_MWh_th: finite,
  stored_sigma_MWh_th: sigma,
  fronts: z.array(front),
  fronts_reason: z.enum(['uniform', 'no_half_crossing', 'not_started']).nullable(),
  energy_position_m: finiteOrNull,
  spread_ratio: finite.min(0).nullable(),
  heat_transfer_factor: finite.gt(0),
  heat_transfer_factor_sigma: sigma,
  strings: z.array(
    z.strictObject({
      id: z.string(),
      flow_factor: finite.gt(0),
      flow_factor_sigma: sigma,
      position_m: finiteOrNull,
      width_m: finite.min(0).nullable(),
    }),
  ),
  sensors: z.strictObject({
    used: z.int().min(0),
    rejected: z.array(
      z.strictObject({
        id: z.string(),
        verdict: z.enum(VERDICTS),
        since: isoUtc,
        ...additional(ADDITIONAL.rejected),
      }),
    ),
  }),
  ...additional(ADDITIONAL.store),
});

const quantiles = z.strictObject({ p90: finite.min(0), p50: finite.min(0), p10: finite.min(0) });

const event = z.strictObject({
  id: z.string(),
  unit: z.string(),
  kind: z.enum(KINDS),
  class: z.enum(['alarm', 'alert']),
  priority: z.enum(['high', 'medium', 'low']),
  subject: z.string(),
  transition: z.enum(['raised', 'returned']),
  time: isoUtc,
  value: finiteOrNull,
  limit: finiteOrNull,
  message: z.string().min(10),
});

export const contractLine = z.strictObject({
  time: isoUtc,
  unit: z.string(),
  revision: z.literal(0),
  mode: z.enum(['charge', 'discharge', 'stand']),
  quality: z.enum(['good', 'degraded', 'blind', 'stale']),
  state_of_charge: finite,
  stores: z.record(z.string(), store),
  dispatch: z
    .array(
      z.strictObject({
        power_MW: finite.gt(0),
        hours: quantiles,
        energy_MWh_el: quantiles,
        ends_by: z.enum(['hot_outlet', 'cold_outlet', 'flow', 'pressure_drop', 'empty']),
      }),
    )
    .optional(),
  events: z.array(event),
});
export type ContractLine = z.output<typeof contractLine>;
