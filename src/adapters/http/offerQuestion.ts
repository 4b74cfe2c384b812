import type { z } from 'zod';
import type { UnitDefinition } from '../../core/definitions.js';
import { instantOf } from '../../core/plan/localTime.js';
import { type OffersAsk, requireOffers, WrongQuestion } from '../../core/plan/offerAsk.js';
import { wrongValue } from './faults.js';
import type { offersBody, offersQuery } from './schema/offers.js';

type Body = z.output<typeof offersBody>;
type Query = z.output<typeof offersQuery>;

const HOUR_S = 3600;

/** The question of a query as that of a body: the simple case, without a plan. */
export function bodyOfQuery(query: Query): Body {
  const { block_min, closes_before_min, count, every_min } = query;
  const { shortfall_per_MWh_el, surplus_per_MWh_el } = query;
  const priced = shortfall_per_MWh_el !== undefined || surplus_per_MWh_el !== undefined;
  const gated = (closes_before_min ?? count ?? every_min) !== undefined;
  return {
    powers_MW_el: query.power_MW,
    ...(query.start === undefined ? {} : { starts: query.start }),
    ...(gated || query.start === undefined
      ? {
          gate: {
            closes_before_min: closes_before_min ?? 0,
            count: count ?? 1,
            ...(every_min === undefined ? {} : { every_min }),
          },
        }
      : {}),
    block_min: Number(block_min ?? 15) as Body['block_min'],
    certainties: query.certainty ?? [0.5, 0.75, 0.9, 0.95],
    plan: [],
    ...(query.horizon_h === undefined ? {} : { horizon_h: query.horizon_h }),
    ...(priced
      ? {
          prices: {
            shortfall_per_MWh_el: shortfall_per_MWh_el ?? Number.NaN,
            surplus_per_MWh_el: surplus_per_MWh_el ?? Number.NaN,
          },
        }
      : {}),
  };
}

/**
 * The core's question, held against the unit and the time of its estimate.
 *
 * @param asked_ms clock of the daemon in source time
 * @throws HttpFault wrong_value with the field as it was written
 */
export function offersAsk(
  unit: UnitDefinition,
  body: Body,
  now_ms: number,
  asked_ms: number,
): OffersAsk {
  const zone = unit.limits.connection?.time_zone ?? null;
  const instant = (text: string, field: string): number => {
    const found = instantOf(text, zone);
    if ('ms' in found) return found.ms;
    throw wrongValue(field, text, found.expected);
  };
  const block_s = (body.block_min * 60) as OffersAsk['block_s'];
  const { gate } = body;
  const ask: OffersAsk = {
    powers_W: body.powers_MW_el.map((power) => power * 1e6),
    ...(body.starts === undefined
      ? {}
      : { starts_ms: body.starts.map((text, i) => instant(text, `starts.${i}`)) }),
    ...(gate === undefined
      ? {}
      : {
          gate: {
            closes_before_s: gate.closes_before_min * 60,
            count: gate.count,
            every_s: gate.every_min === undefined ? block_s : gate.every_min * 60,
          },
        }),
    block_s,
    certainties: body.certainties,
    legs: body.plan.map(({ mode, power_MW_el, from, to }, i) => ({
      mode,
      power_W: power_MW_el * 1e6,
      from_ms: instant(from, `plan.${i}.from`),
      to_ms: instant(to, `plan.${i}.to`),
    })),
    ...(body.horizon_h === undefined ? {} : { horizon_s: body.horizon_h * HOUR_S }),
    ...(body.prices === undefined ? {} : { prices: body.prices }),
    asked_ms,
  };
  try {
    requireOffers(unit, now_ms, ask);
  } catch (thrown) {
    if (!(thrown instanceof WrongQuestion)) throw thrown;
    throw wrongValue(asWritten(thrown.field), thrown.value, thrown.expected);
  }
  return ask;
}

/** Names of the core as a client writes them. */
function asWritten(field: string): string {
  const names: [RegExp, string][] = [
    [/powers_W/g, 'powers_MW_el'],
    [/power_W/g, 'power_MW_el'],
    [/starts_ms/g, 'starts'],
    [/^legs/, 'plan'],
    [/(from|to)_ms/g, '$1'],
    [/horizon_s/g, 'horizon_h'],
    [/(closes_before|every|block)_s/g, '$1_min'],
    [/\[(\d+)\]/g, '.$1'],
  ];
  return names.reduce((text, [found, instead]) => text.replace(found, instead), field);
}
