/** What being wrong costs, per MWh_el, in the user's currency. */
export interface BidPrices {
  /** Each MWh_el sold and not given: what it costs to make good beyond the price it was sold at. */
  readonly shortfall_per_MWh_el: number;
  /** Each MWh_el that could have been given and was not sold: its price less what it is worth kept. */
  readonly surplus_per_MWh_el: number;
}

/**
 * The certainty worth bidding: with a cost u of each MWh short and o of each MWh not sold, the expected
 * cost u E[(q - D)+] + o E[(D - q)+] of bidding q against what can be given D is least where
 *
 *   P(D < q) = o/(u + o),     certainty = P(D >= q) = u/(u + o)
 *
 * (the newsvendor's critical ratio: Arrow, Harris & Marschak 1951, Econometrica 19, 250; for energy
 * sold ahead: Pinson, Chevallier & Kariniotakis 2007, IEEE Trans. Power Systems 22, 1148).
 *
 * @returns 0 to 1; above what is firm where being short is the dearer fault
 * @throws RangeError for a cost that is not above 0
 */
export function worthBidding(prices: BidPrices): number {
  for (const [name, cost] of Object.entries(prices) as [keyof BidPrices, number][]) {
    if (!(cost > 0 && Number.isFinite(cost))) {
      throw new RangeError(`${name} = ${cost}: expected a finite number above 0`);
    }
  }
  const { shortfall_per_MWh_el: short, surplus_per_MWh_el: surplus } = prices;
  return short / (short + surplus);
}
