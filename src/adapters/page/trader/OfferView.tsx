import { Choices } from '../parts/Choices.js';
import { OfferDetail } from './OfferDetail.js';
import { figureAt, OfferMatrix, offerAt, powersOf, startsOf } from './OfferMatrix.js';
import { TradePicture, type TradePoint } from './TradePicture.js';
import { shortTime } from './times.js';
import { WaitPicture } from './WaitPicture.js';
import type { Offer, OfferTable } from './wire.js';
import { oddsOf } from './words.js';

export interface OfferChoice {
  readonly power_MW_el: number;
  readonly start: string;
}

/** The offer that is looked at: the chosen one, else the greatest power from the first start. */
export function chosenOf(table: OfferTable, chosen: OfferChoice | null): Offer | null {
  const [start] = startsOf(table);
  const power =
    powersOf(table).find((one) => offerAt(table, one, start ?? '')?.refused === null) ??
    powersOf(table)[0];
  const usual = power === undefined ? undefined : offerAt(table, power, start ?? '');
  if (chosen === null) return usual ?? null;
  return offerAt(table, chosen.power_MW_el, chosen.start) ?? usual ?? null;
}

/** An offer table: pictures, figures, and one offer closely. */
export function OfferView({
  table,
  certainty,
  onCertainty,
  chosen,
  onChoose,
  onCheck,
}: {
  table: OfferTable;
  certainty: number;
  onCertainty(certainty: number): void;
  chosen: OfferChoice | null;
  onChoose(choice: OfferChoice): void;
  onCheck?: ((offer: Offer) => void) | undefined;
}) {
  const zone = table.limits.connection?.time_zone ?? null;
  const time_ms = Date.parse(table.time);
  const held = table.certainties.some((one) => Math.abs(one - certainty) < 1e-9)
    ? certainty
    : (table.certainties[0] ?? certainty);
  const one = chosenOf(table, chosen);
  if (one === null) return <p>Nothing is offered.</p>;
  return (
    <>
      <Choices
        legend="Certainty of the large figures"
        name={`certainty-${table.kept ?? 'now'}`}
        options={[...table.certainties]
          .sort((a, b) => a - b)
          .map((value) => ({ value: String(value), label: labelOf(value) }))}
        chosen={String(held)}
        onChoose={(value) => onCertainty(Number(value))}
      />
      <div class="offer-view">
        <OfferMatrix {...{ table, onChoose }} certainty={held} chosen={one} />
        <OfferDetail
          {...{ table }}
          offer={one}
          certainty={held}
          onCheck={onCheck === undefined ? undefined : () => onCheck(one)}
        />
        <TradePicture
          points={table.offers
            .filter(({ start, refused }) => start === one.start && refused === null)
            .map((offer) => pointOf(offer, held))}
          certainty={held}
          chosen_MW={one.power_MW_el}
          title={`How long at which power, from ${shortTime(zone, one.start, time_ms)}`}
        />
        <WaitPicture
          offers={table.offers.filter(({ power_MW_el }) => power_MW_el === one.power_MW_el)}
          certainty={held}
          chosen={one}
          {...{ zone, time_ms }}
        />
      </div>
    </>
  );
}

function pointOf(offer: Offer, certainty: number): TradePoint {
  const { power_MW_el, hours, energy_MWh_el } = offer;
  const at = figureAt(offer, certainty);
  return {
    ...{ power_MW_el, hours },
    firm_h: at?.hours ?? hours.p90,
    firm_MWh_el: at?.energy_MWh_el ?? energy_MWh_el.p90,
  };
}

const labelOf = (certainty: number): string =>
  Math.abs(certainty - 0.9) < 1e-9 ? `firm (${oddsOf(certainty)})` : oddsOf(certainty);

/** The table as rows of cells, as it is shown: all certainties. */
export function tableRows(table: OfferTable): (string | number | null)[][] {
  const zone = table.limits.connection?.time_zone ?? null;
  const names = table.certainties.flatMap((one) => [
    `MWh_el at ${one * 100} %`,
    `hours at ${one * 100} %`,
  ]);
  const head = ['power_MW_el', `start (${zone ?? 'UTC'})`, ...names, 'p10 MWh_el', 'refused'];
  return [
    head,
    ...table.offers.map((offer) => [
      offer.power_MW_el,
      offer.start,
      ...table.certainties.flatMap((certainty) => {
        const at = figureAt(offer, certainty);
        return offer.refused === null
          ? [at?.energy_MWh_el ?? null, at?.hours ?? null]
          : [null, null];
      }),
      offer.refused === null ? offer.energy_MWh_el.p10 : null,
      offer.refused,
    ]),
  ];
}
