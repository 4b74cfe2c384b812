import type { OfferTable, WrittenOffer } from '../../core/plan/offerTable.js';
import { STAND_COLUMNS, type Stand, standOf, toCsv } from './csv.js';
import type { HistoryPoint } from './service.js';

const COLUMNS = [
  ...STAND_COLUMNS,
  'power_MW_el',
  'start',
  'part',
  'from',
  'to',
  'certainty',
  'energy_MWh_el',
  'hours',
  'expected_shortfall_MWh_el',
  'mean_below_MWh_el',
  'whole_blocks_alone',
  'whole_blocks_jointly',
  'whole_alone',
  'whole_jointly',
  'refused',
] as const;

/**
 * An offer table as rows: per power, start and certainty one of the `whole` discharge, then one per
 * `block`. What a part does not have is empty.
 */
export function offersCsv(head: Stand, table: OfferTable): string {
  const stand = standOf(head);
  return toCsv(
    COLUMNS,
    table.offers.flatMap((offer) => rowsOf(stand, offer)),
  );
}

function rowsOf(stand: HistoryPoint, offer: WrittenOffer): HistoryPoint[] {
  const { power_MW_el, start, begins, refused } = offer;
  const head = { ...stand, power_MW_el, start, refused };
  const whole = offer.at.map(
    ({ whole_blocks, ...at }): HistoryPoint => ({
      ...head,
      ...at,
      part: 'whole',
      from: begins,
      whole_blocks_alone: whole_blocks.alone,
      whole_blocks_jointly: whole_blocks.jointly,
    }),
  );
  const blocks = offer.blocks.flatMap(({ from, to, whole: { alone, jointly }, at }) =>
    at.map(
      (one): HistoryPoint => ({
        ...head,
        ...one,
        ...{ part: 'block', from, to, whole_alone: alone, whole_jointly: jointly },
      }),
    ),
  );
  return [...whole, ...blocks];
}
