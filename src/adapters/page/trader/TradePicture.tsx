import { fixed, hoursText, power } from '../lib/format.js';
import { useWidth } from '../parts/useWidth.js';
import { Axes } from './Axes.js';
import { type Frame, pathOf, roundMarks, scaleOf } from './picture.js';
import type { Quantiles } from './wire.js';
import { certaintyWords } from './words.js';

const HEIGHT = 290;

/** What a power lasts for: quantiles, and the figures at the certainty that is looked at. */
export interface TradePoint {
  readonly power_MW_el: number;
  readonly hours: Quantiles;
  readonly firm_h: number;
  readonly firm_MWh_el: number;
}

/**
 * Power against duration: the band of what may come, with the firm figure as its lower edge. An area is
 * an energy here, so the chosen power is a filled one, and thin lines are those of equal energy.
 */
export function TradePicture({
  points,
  certainty,
  chosen_MW,
  title,
}: {
  points: readonly TradePoint[];
  certainty: number;
  chosen_MW: number | null;
  title: string;
}) {
  const { ref, width } = useWidth<HTMLDivElement>();
  const shown = [...points].sort((a, b) => a.power_MW_el - b.power_MW_el);
  return (
    <figure class="picture">
      <figcaption>{title}; an area is an energy</figcaption>
      <div ref={ref}>
        {width > 0 && shown.length > 0 && <Drawing {...{ shown, certainty, chosen_MW, width }} />}
        {shown.length === 0 && <p>Nothing to draw: every power is refused.</p>}
      </div>
    </figure>
  );
}

function Drawing({
  shown,
  certainty,
  chosen_MW,
  width,
}: {
  shown: readonly TradePoint[];
  certainty: number;
  chosen_MW: number | null;
  width: number;
}) {
  const longest = Math.max(...shown.map(({ hours }) => hours.p10));
  const greatest = Math.max(...shown.map(({ power_MW_el }) => power_MW_el));
  const across = roundMarks(longest * 1.04, width < 500 ? 5 : 8);
  const up = roundMarks(greatest * 1.1, 4);
  const frame: Frame = { width, height: HEIGHT, left: 36, right: 20, top: 26, bottom: 40 };
  const x = scaleOf([0, across.at(-1)!], [frame.left, width - frame.right]);
  const y = scaleOf([0, up.at(-1)!], [HEIGHT - frame.bottom, frame.top]);
  const line = (of: (point: TradePoint) => number) =>
    shown.map((point) => [x(of(point)), y(point.power_MW_el)] as const);
  const band = [...line(({ hours }) => hours.p90), ...line(({ hours }) => hours.p10).reverse()];
  const most_MWh = across.at(-1)! * up.at(-1)!;
  const energies = roundMarks(most_MWh * 0.6, width < 500 ? 2 : 5).slice(1);
  const one = shown.find(({ power_MW_el }) => power_MW_el === chosen_MW) ?? null;
  const words = shown
    .map(({ power_MW_el, firm_h }) => `${power(power_MW_el)} MW for ${hoursText(firm_h)}`)
    .join(', ');
  return (
    <svg
      width={width}
      height={HEIGHT}
      role="img"
      aria-label={`Power against duration, ${certaintyWords(certainty)}: ${words}`}
    >
      <Axes
        {...{ frame, x, y }}
        across={across.map((value) => [value, `${value}`])}
        up={up.map((value) => [value, `${value}`])}
        upName="MW_el"
        acrossName="hours"
      />
      {energies.map((energy) => (
        <Equal
          key={energy}
          energy={energy}
          {...{ frame, x, y }}
          most={up.at(-1)!}
          longest={across.at(-1)!}
        />
      ))}
      {one !== null && (
        <rect
          class="energy"
          data-field="chosen-area"
          x={x(0)}
          y={y(one.power_MW_el)}
          width={Math.max(0, x(one.firm_h) - x(0))}
          height={y(0) - y(one.power_MW_el)}
        />
      )}
      <path class="band" d={`${pathOf(band)}Z`} />
      <path class="middle" d={pathOf(line(({ hours }) => hours.p50))} />
      <path class="firm" d={pathOf(line(({ firm_h }) => firm_h))} />
      {shown.map(({ power_MW_el, firm_h, hours }) => (
        <g key={power_MW_el}>
          <line
            class="spread"
            x1={x(firm_h)}
            x2={x(hours.p10)}
            y1={y(power_MW_el)}
            y2={y(power_MW_el)}
          />
          <circle class="dot" cx={x(firm_h)} cy={y(power_MW_el)} r="3.5" />
        </g>
      ))}
      {one !== null && (
        <text {...energyPlace(x(0), x(one.firm_h), y(one.power_MW_el), y(0))}>
          {fixed(one.firm_MWh_el, 2)} MWh
          <tspan dx="0.5" dy="4" class="index">
            el
          </tspan>
        </text>
      )}
    </svg>
  );
}

/** The figure needs so much of the area that it stands on [px]. */
const FIGURE_PX = 110;

/** In the area of an energy, or right beside its foot where it is too narrow for that. */
function energyPlace(left: number, right: number, top: number, bottom: number) {
  return right - left >= FIGURE_PX
    ? { class: 'on-energy', x: left + 10, y: top + 22 }
    : { class: 'figure', x: right + 6, y: bottom - 8 };
}

/** Line of equal energy, with its figure where it leaves the frame. */
function Equal({
  energy,
  frame,
  x,
  y,
  most,
  longest,
}: {
  energy: number;
  frame: Frame;
  x(value: number): number;
  y(value: number): number;
  most: number;
  longest: number;
}) {
  const shortest = energy / most;
  if (shortest >= longest) return null;
  const points = Array.from({ length: 41 }, (_, i) => {
    const hours = shortest * (longest / shortest) ** (i / 40);
    return [x(hours), y(energy / hours)] as const;
  });
  return (
    <g class="equal">
      <path d={pathOf(points)} />
      <text x={x(shortest)} y={frame.top - 8} text-anchor="middle">
        {energy} MWh
        <tspan dx="0.5" dy="3" class="index">
          el
        </tspan>
      </text>
    </g>
  );
}
