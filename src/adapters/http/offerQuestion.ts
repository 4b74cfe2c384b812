import type { z } from 'zod';
import type { UnitDefinition } from '../../core/definitions.js';
import { type OffersAsk, WrongQuestion } from '../../core/plan/offerAsk.js';
import { offersAskOf, USUAL_CERTAINTIES } from '../../core/plan/offerWords.js';
import { wrongValue } from './faults.js';
import type { offersBody, offersQuery } from './schema/offersAsk.js';

type Body = z.output<typeof offersBody>;
type Query = z.output<typeof offersQuery>;

/**
 * The question of a query as that of a body: the simple case, without a plan.
 *
 * @throws HttpFault wrong_value for a start beside a gate, or one price without the other
 */
export function bodyOfQuery(query: Query): Body {
  const { block_min, closes_before_min, count, every_min } = query;
  const { shortfall_per_MWh_el, surplus_per_MWh_el } = query;
  const priced = shortfall_per_MWh_el !== undefined || surplus_per_MWh_el !== undefined;
  const gated = (closes_before_min ?? count ?? every_min) !== undefined;
  if (gated && query.start !== undefined) {
    const beside = 'none beside closes_before_min, count or every_min';
    throw wrongValue('start', query.start.join(','), beside);
  }
  const prices = { shortfall_per_MWh_el, surplus_per_MWh_el };
  for (const [field, price] of Object.entries(prices)) {
    if (!priced || (price ?? 0) > 0) continue;
    const both = 'a number above 0, per MWh_el: both prices or none';
    throw wrongValue(field, price ?? null, both);
  }
  return {
    powers_MW_el: query.power_MW,
    ...(query.start === undefined ? {} : { starts: query.start }),
    ...(query.start === undefined
      ? {
          gate: {
            closes_before_min: closes_before_min ?? 0,
            count: count ?? 1,
            ...(every_min === undefined ? {} : { every_min }),
          },
        }
      : {}),
    block_min: Number(block_min ?? 15) as Body['block_min'],
    certainties: query.certainty ?? [...USUAL_CERTAINTIES],
    plan: [],
    keep: query.keep === 'true',
    stale: query.stale,
    format: query.format,
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
 * The core's question; see `offersAskOf`.
 *
 * @param of where it was asked: a query has names of its own
 * @throws HttpFault wrong_value with the field as it was written
 */
export function offersAsk(
  unit: UnitDefinition,
  body: Body,
  now_ms: number,
  asked_ms: number,
  of: 'query' | 'body',
): OffersAsk {
  try {
    return offersAskOf(unit, body, now_ms, asked_ms);
  } catch (thrown) {
    if (!(thrown instanceof WrongQuestion)) throw thrown;
    const field = of === 'body' ? thrown.field : inQuery(thrown.field);
    throw wrongValue(field, thrown.value, thrown.expected);
  }
}

/** A field of a body as a query names it. */
function inQuery(field: string): string {
  return field
    .replace(/powers_MW_el/, 'power_MW')
    .replace(/starts/, 'start')
    .replace(/certainties/, 'certainty')
    .replace(/^(gate|prices)\./, '');
}
