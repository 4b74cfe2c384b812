import { fixed, power } from '../lib/format.js';
import { useWidth } from '../parts/useWidth.js';
import { Axes } from './Axes.js';
import { figureAt } from './OfferMatrix.js';
import { type Frame, roundMarks, scaleOf } from './picture.js';
import { shortTime } from './times.js';
import type { Offer } from './wire.js';
import { certaintyWords } from './words.js';

const HEIGHT = 290;

/** What waiting costs: the energy at one power from each start, firm as a column, the rest above. */
export function WaitPicture({
  offers,
  certainty,
  chosen,
  zone,
  time_ms,
}: {
  /** Of one power, by start. */
  offers: readonly Offer[];
  certainty: number;
  chosen: Offer | null;
  zone: string | null;
  time_ms: number;
}) {
  const { ref, width } = useWidth<HTMLDivElement>();
  const own = offers[0];
  return (
    <figure class="picture">
      <figcaption>
        What waiting costs at {own === undefined ? '–' : power(own.power_MW_el)} MW; the open part
        is not firm
      </figcaption>
      <div ref={ref}>
        {width > 0 && offers.length > 0 && (
          <Drawing {...{ offers, certainty, chosen, zone, time_ms, width }} />
        )}
      </div>
    </figure>
  );
}

function Drawing({
  offers,
  certainty,
  chosen,
  zone,
  time_ms,
  width,
}: Parameters<typeof WaitPicture>[0] & { width: number }) {
  const most = Math.max(0.1, ...offers.map(({ energy_MWh_el }) => energy_MWh_el.p10));
  const up = roundMarks(most * 1.05, 4);
  const frame: Frame = { width, height: HEIGHT, left: 36, right: 4, top: 26, bottom: 40 };
  const y = scaleOf([0, up.at(-1)!], [HEIGHT - frame.bottom, frame.top]);
  const x = scaleOf([-0.5, offers.length - 0.5], [frame.left, width - frame.right]);
  const wide = Math.min(64, (x(1) - x(0)) * 0.62);
  const firm = (offer: Offer) =>
    offer.refused === null ? (figureAt(offer, certainty)?.energy_MWh_el ?? 0) : 0;
  const few = offers.length > (width < 500 ? 5 : 9) ? 2 : 1;
  const words = offers
    .map((offer) => `${fixed(firm(offer), 2)} MWh el from ${shortTime(zone, offer.start, time_ms)}`)
    .join(', ');
  return (
    <svg
      width={width}
      height={HEIGHT}
      role="img"
      aria-label={`Energy against start, ${certaintyWords(certainty)}: ${words}`}
    >
      <Axes
        {...{ frame, x, y }}
        across={offers.flatMap((offer, i) =>
          i % few === 0 ? [[i, shortTime(zone, offer.start, time_ms)] as const] : [],
        )}
        up={up.map((value) => [value, `${value}`])}
        upName="MWh el"
        acrossName="start"
      />
      {offers.map((offer, i) => {
        const left = x(i) - wide / 2;
        const { p50, p10 } = offer.energy_MWh_el;
        if (offer.refused !== null) {
          return (
            <text key={offer.start} class="care" x={x(i)} y={y(0) - 8} text-anchor="middle">
              ✕ refused
            </text>
          );
        }
        return (
          <g
            key={offer.start}
            data-start={offer.start}
            class={offer === chosen ? 'chosen' : undefined}
          >
            <rect
              class="energy"
              x={left}
              width={wide}
              y={y(firm(offer))}
              height={Math.max(0, y(0) - y(firm(offer)))}
            />
            <rect
              class="open"
              x={left}
              width={wide}
              y={y(p10)}
              height={Math.max(0, y(firm(offer)) - y(p10))}
            />
            <line class="middle" x1={left} x2={left + wide} y1={y(p50)} y2={y(p50)} />
            <text class="on-energy" x={x(i)} y={y(firm(offer)) + 18} text-anchor="middle">
              {fixed(firm(offer), 2)}
            </text>
          </g>
        );
      })}
    </svg>
  );
}
