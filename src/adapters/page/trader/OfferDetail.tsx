import { fixed, hoursText, percent, power } from '../lib/format.js';
import { Unit } from '../parts/Unit.js';
import { figureAt } from './OfferMatrix.js';
import { shortTime } from './times.js';
import type { Offer, OfferTable } from './wire.js';
import {
  causeWords,
  certaintyWords,
  chance,
  endsWords,
  firstMinutesWords,
  limitedWords,
} from './words.js';

/** One offer closely: what limits it, what ends it, its blocks. */
export function OfferDetail({
  table,
  offer,
  certainty,
  onCheck,
}: {
  table: OfferTable;
  offer: Offer;
  certainty: number;
  /** Absent: of an earlier time, nothing to check any more. */
  onCheck?: (() => void) | undefined;
}) {
  const zone = table.limits.connection?.time_zone ?? null;
  const clock = (time: string | number) => shortTime(zone, time, Date.parse(table.time));
  const at = figureAt(offer, certainty);
  if (offer.refused !== null) {
    return (
      <div class="closely">
        <h2>
          {power(offer.power_MW_el)}
          <Unit name="MW_el" /> from {clock(offer.start)}
        </h2>
        <p class="care">✕ Not offered: {causeWords(offer.refused)}.</p>
      </div>
    );
  }
  const begins_ms = Date.parse(offer.begins);
  const drawn = offer.start_up_MWh_el.before_start + offer.start_up_MWh_el.after_start;
  const late_min = Math.round((begins_ms - Date.parse(offer.start)) / 60_000);
  const first = firstMinutesWords(offer.first_minutes);
  return (
    <div class="closely" data-offer={offer.power_MW_el}>
      <h2>
        {power(offer.power_MW_el)}
        <Unit name="MW_el" /> from {clock(offer.start)}
      </h2>
      <p class="large">
        <strong data-field="chosen-energy">{fixed(at?.energy_MWh_el, 2)}</strong>
        <Unit name="MWh_el" />
        <span>
          {certaintyWords(certainty)}: {hoursText(at?.hours)}
          {at !== undefined && `, to ${clock(begins_ms + at.hours * 3_600_000)}`}
        </span>
      </p>
      <dl class="facts">
        <dt>Whole blocks</dt>
        <dd>
          {at?.whole_blocks.alone ?? '–'} of {table.block_s / 60} min
        </dd>
        <dt>Ends by</dt>
        <dd data-field="ends">{endsWords(offer.ends_by)}</dd>
        {offer.limited.length > 0 && (
          <>
            <dt>Limited</dt>
            <dd class="care">▲ {limitedWords(offer.limited, clock)}</dd>
          </>
        )}
        {late_min > 0 && (
          <>
            <dt>First power</dt>
            <dd>
              {clock(offer.begins)}, {late_min} min after the start: it is not ready before
            </dd>
          </>
        )}
        {first !== null && (
          <>
            <dt>First minutes</dt>
            <dd>{first}</dd>
          </>
        )}
        {drawn > 0 && (
          <>
            <dt>Start-up draws</dt>
            <dd>
              {fixed(drawn, 3)}
              <Unit name="MWh_el" />, not in the figures
            </dd>
          </>
        )}
        <dt>Should it fall short</dt>
        <dd>
          {at?.mean_below_MWh_el === null || at === undefined ? (
            'as far as is known it does not'
          ) : (
            <>
              {fixed(at.mean_below_MWh_el, 2)}
              <Unit name="MWh_el" /> are then given on average
            </>
          )}
        </dd>
        {offer.bid !== null && (
          <>
            <dt>Worth bidding</dt>
            <dd data-field="bid">
              {fixed(offer.bid.energy_MWh_el, 2)}
              <Unit name="MWh_el" />, certain to {percent(offer.bid.certainty, 0)} % by these prices
            </dd>
          </>
        )}
      </dl>
      {onCheck !== undefined && (
        <p>
          <button type="button" onClick={onCheck}>
            Check its blocks as a schedule
          </button>
        </p>
      )}
      <details>
        <summary>Block by block</summary>
        <table class="plain">
          <thead>
            <tr>
              <th scope="col">block</th>
              <th scope="col">
                {certaintyWords(certainty)}, MWh<sub>el</sub>
              </th>
              <th scope="col">run through</th>
            </tr>
          </thead>
          <tbody>
            {offer.blocks
              .filter(
                ({ whole, at: given }) =>
                  whole.alone > 0 || given.some((one) => one.energy_MWh_el > 0),
              )
              .map((block) => (
                <tr key={block.from}>
                  <th scope="row">
                    {clock(block.from)} – {clock(block.to)}
                  </th>
                  <td>
                    {fixed(
                      block.at.find((one) => Math.abs(one.certainty - certainty) < 1e-9)
                        ?.energy_MWh_el,
                      2,
                    )}
                  </td>
                  <td>{chance(block.whole.alone)}</td>
                </tr>
              ))}
          </tbody>
        </table>
      </details>
    </div>
  );
}
