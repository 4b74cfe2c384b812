import type { OffersAsk } from '../../../src/core/plan/offerAsk.js';
import { type OfferedRun, offerFigures } from '../../../src/core/plan/offerFigures.js';
import type { Offer } from '../../../src/core/plan/offers.js';

/**
 * Offers by a script: a discharge ends evenly between 90 and 110 % of what the charge gives; each hour
 * of waiting loses 0.4 % and widens that by 0.6 %. Above 3 MW nothing is offered.
 */
export function scriptedOffers(ask: OffersAsk, now_ms: number, charge_MWh: number): Offer[] {
  const { gate } = ask;
  const begin_ms = now_ms + (gate?.closes_before_s ?? 0) * 1000;
  const starts =
    ask.starts_ms ??
    Array.from({ length: gate?.count ?? 1 }, (_, i) => begin_ms + i * (gate?.every_s ?? 0) * 1000);
  return starts.flatMap((start_ms) =>
    ask.powers_W.map((power_W): Offer => {
      const start_s = (start_ms - now_ms) / 1000;
      const waits_h = Math.max(0, start_s / 3600 - 2);
      const lasts_s = (charge_MWh / (power_W / 1e6)) * 3600 * (1 - 0.004 * waits_h);
      const spread = 0.1 + 0.006 * waits_h;
      const stops_s = Float64Array.from(
        { length: 200 },
        (_, i) => start_s + lasts_s * (1 - spread + (2 * spread * (i + 0.5)) / 200),
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
        ...{
          start_s,
          begins_s: start_s,
          refused: power_W > 3e6 ? 'above_greatest_power' : null,
          limited: [],
          plan_limited: [],
        },
        start_up_MWh_el: { before_start: 0.01, after_start: 0 },
        ...offerFigures(run, ask.block_s, ask.certainties),
        ends_by: { hot_outlet: 1 },
        plan_holds: 1,
        plan_stores_hold: 1,
      };
    }),
  );
}
