import type { OffersAsk } from './offerAsk.js';
import type { OfferAt } from './offerFigures.js';
import type { PastOffer } from './offerReport.js';
import type { AnsweredOffers, WrittenOffer } from './offerTable.js';

/** An offer without its blocks. */
export type OfferSummary = Pick<
  WrittenOffer,
  | 'power_MW_el'
  | 'start'
  | 'begins'
  | 'refused'
  | 'hours'
  | 'energy_MWh_el'
  | 'plan_holds'
  | 'plan_stores_hold'
>;

/** What is kept of an offer table, beside its figures block by block; times are ms since 1970. */
export interface KeptOffers {
  /** Its number, never given twice. */
  readonly no: number;
  /** When it was asked for, and the source time of the estimate it stands on. */
  readonly asked_ms: number;
  readonly time_ms: number;
  readonly asked: OffersAsk;
  readonly offers: readonly OfferSummary[];
}

export function summaryOf(offer: WrittenOffer): OfferSummary {
  const { power_MW_el, start, begins, refused, hours, energy_MWh_el } = offer;
  const { plan_holds, plan_stores_hold } = offer;
  return {
    ...{ power_MW_el, start, begins, refused, hours, energy_MWh_el },
    ...{ plan_holds, plan_stores_hold },
  };
}

/** An offer as it is announced: at each certainty too, but not block by block. */
export interface ShortOffer extends OfferSummary {
  readonly at: readonly Pick<OfferAt, 'certainty' | 'hours' | 'energy_MWh_el' | 'whole_blocks'>[];
}

/** An answered table with its head, but without blocks: some kB, whatever was asked. */
export function shortTable(
  answer: AnsweredOffers,
): Omit<AnsweredOffers, 'offers'> & { readonly offers: ShortOffer[] } {
  return {
    ...answer,
    offers: answer.offers.map((offer) => ({
      ...summaryOf(offer),
      at: offer.at.map(({ certainty, hours, energy_MWh_el, whole_blocks }) => ({
        ...{ certainty, hours, energy_MWh_el, whole_blocks },
      })),
    })),
  };
}

/** The offers of a kept table, as a report holds them against what was delivered. */
export function pastOffers(
  no: number,
  asked_ms: number,
  asked: OffersAsk,
  offers: readonly OfferSummary[],
): PastOffer[] {
  return offers.map((offer) => ({
    ...{ no, asked_ms },
    power_MW_el: offer.power_MW_el,
    begins_ms: Date.parse(offer.begins),
    refused: offer.refused !== null,
    energy_MWh_el: offer.energy_MWh_el,
    // From the start on the plan is replaced by the offer.
    legs: (asked.legs ?? []).filter((leg) => leg.from_ms < Date.parse(offer.start)),
  }));
}
