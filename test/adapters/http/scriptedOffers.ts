import type { OffersAsk } from '../../../src/core/plan/offerAsk.js';
import { type OfferedRun, offerFigures } from '../../../src/core/plan/offerFigures.js';
import type { Offer } from '../../../src/core/plan/offers.js';

/** Offers by a script: a discharge ends evenly between 90 and 110 % of what the charge gives. */
export function scriptedOffers(ask: OffersAsk, now_ms: number, charge_MWh: number): Offer[] {
  const starts = ask.starts_ms ?? [now_ms + (ask.gate?.closes_before_s ?? 0) * 1000];
  return starts.flatMap((start_ms) =>
    ask.powers_W.map((power_W): Offer => {
      const start_s = (start_ms - now_ms) / 1000;
      const lasts_s = (charge_MWh / (power_W / 1e6)) * 3600;
      const stops_s = Float64Array.from(
        { length: 200 },
        (_, i) => start_s + lasts_s * (0.9 + (0.2 * (i + 0.5)) / 200),
      );
      const end = start_s + (ask.horizon_s ?? 2 * lasts_s);
      const run: OfferedRun = {
        ...{ start_s, begins_s: start_s, ends_s: end, closes_s: end, stops_s },
        pieces: [{ from_s: start_s, to_s: end, power0_W: power_W, power1_W: power_W }],
        held: new Uint8Array(200).fill(1),
        missing: null,
        bid: ask.prices === undefined ? null : 0.75,
      };
      return {
        power_MW_el: power_W / 1e6,
        ...{ start_s, begins_s: start_s, refused: null, limited: [], plan_limited: [] },
        start_up_MWh_el: { before_start: 0.01, after_start: 0 },
        ...offerFigures(run, ask.block_s, ask.certainties),
        ends_by: { hot_outlet: 1 },
        plan_holds: 1,
        plan_stores_hold: 1,
      };
    }),
  );
}
