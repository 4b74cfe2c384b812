import { fixed, hoursText, power } from '../lib/format.js';
import { Unit } from '../parts/Unit.js';
import { Scrolled } from './Scrolled.js';
import { shortTime } from './times.js';
import type { Offer, OfferTable } from './wire.js';
import { causeWords, certaintyWords } from './words.js';

/** Offers of a table by power, then by start. */
export function offerAt(table: OfferTable, power_MW_el: number, start: string): Offer | undefined {
  return table.offers.find((one) => one.power_MW_el === power_MW_el && one.start === start);
}

export const startsOf = (table: OfferTable): string[] => [
  ...new Set(table.offers.map(({ start }) => start)),
];
export const powersOf = (table: OfferTable): number[] =>
  [...new Set(table.offers.map(({ power_MW_el }) => power_MW_el))].sort((a, b) => b - a);

export const figureAt = (offer: Offer, certainty: number) =>
  offer.at.find((one) => Math.abs(one.certainty - certainty) < 1e-9);

/** All offers: a row for each power, a column for each start; one is chosen to be looked at. */
export function OfferMatrix({
  table,
  certainty,
  chosen,
  onChoose,
}: {
  table: OfferTable;
  certainty: number;
  chosen: Offer | null;
  onChoose(offer: Offer): void;
}) {
  const zone = table.limits.connection?.time_zone ?? null;
  const time_ms = Date.parse(table.time);
  const starts = startsOf(table);
  return (
    <Scrolled label="Offers by power and start">
      <table class="matrix">
        <caption>
          Large: MWh<sub>el</sub> that are {certaintyWords(certainty)}, and for how long; small:
          even (p50) and hopeful (p10)
        </caption>
        <thead>
          <tr>
            <th scope="col">from</th>
            {starts.map((start) => (
              <th key={start} scope="col">
                {shortTime(zone, start, time_ms)}
              </th>
            ))}
          </tr>
        </thead>
        <tbody>
          {powersOf(table).map((own) => (
            <tr key={own} data-power={own}>
              <th scope="row">
                {power(own)}
                <Unit name="MW_el" />
              </th>
              {starts.map((start) => {
                const offer = offerAt(table, own, start);
                return (
                  <td key={start}>
                    {offer === undefined ? (
                      '–'
                    ) : (
                      <Cell
                        offer={offer}
                        certainty={certainty}
                        pressed={offer === chosen}
                        onChoose={() => onChoose(offer)}
                      />
                    )}
                  </td>
                );
              })}
            </tr>
          ))}
        </tbody>
      </table>
    </Scrolled>
  );
}

function Cell({
  offer,
  certainty,
  pressed,
  onChoose,
}: {
  offer: Offer;
  certainty: number;
  pressed: boolean;
  onChoose(): void;
}) {
  const at = figureAt(offer, certainty);
  const refused = offer.refused !== null;
  return (
    <button type="button" aria-pressed={pressed} onClick={onChoose}>
      {refused ? (
        <span class="refused">✕ refused: {causeWords(offer.refused!)}</span>
      ) : (
        <>
          <strong data-field="energy">{fixed(at?.energy_MWh_el, 2)}</strong>
          <span data-field="hours">{hoursText(at?.hours)}</span>
          <small>
            <span>p50 {fixed(offer.energy_MWh_el.p50, 2)}</span>{' '}
            <span>p10 {fixed(offer.energy_MWh_el.p10, 2)}</span>
          </small>
          {offer.limited.length > 0 && <small class="limited">▲ limited</small>}
        </>
      )}
    </button>
  );
}
