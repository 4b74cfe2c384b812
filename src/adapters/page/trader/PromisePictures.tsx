import { fixed, percent } from '../lib/format.js';
import { useWidth } from '../parts/useWidth.js';
import { Axes } from './Axes.js';
import { type Frame, scaleOf } from './picture.js';
import { wallOf } from './times.js';
import type { KeptShare, TestedOffer } from './wire.js';

const ROW = 58;

/** How often each figure was kept, with what the count leaves open, against how often was meant. */
export function SharePicture({ rows }: { rows: readonly { name: string; kept: KeptShare }[] }) {
  const { ref, width } = useWidth<HTMLDivElement>();
  const frame: Frame = {
    width,
    ...{ height: rows.length * ROW + 46, left: 4, right: 16, top: 6, bottom: 40 },
  };
  const x = scaleOf([0, 1], [frame.left + 10, width - frame.right]);
  const words = rows.map(({ name, kept }) => `${name}: ${kept.kept} of ${kept.of}`).join(', ');
  return (
    <figure class="picture">
      <figcaption>Share of discharges that gave at least what was said</figcaption>
      <div ref={ref}>
        {width > 0 && (
          <svg width={width} height={frame.height} role="img" aria-label={words}>
            <Axes
              {...{ frame, x }}
              y={() => 0}
              up={[]}
              across={[0, 0.25, 0.5, 0.75, 1].map((value) => [value, `${value * 100}`])}
              acrossName="% of discharges"
            />
            {rows.map(({ name, kept }, i) => {
              const y = frame.top + i * ROW + 36;
              const { interval, share, meant } = kept;
              return (
                <g key={name}>
                  <text class="figure" x={frame.left} y={y - 20}>
                    {name}
                  </text>
                  <line class="rule" x1={x(0)} x2={x(1)} y1={y} y2={y} />
                  <line class="meant" x1={x(meant)} x2={x(meant)} y1={y - 11} y2={y + 11} />
                  <text
                    x={x(meant) + (meant > 0.7 ? -5 : 5)}
                    y={y - 8}
                    text-anchor={meant > 0.7 ? 'end' : 'start'}
                  >
                    meant {percent(meant, 0)}
                  </text>
                  {interval !== null && (
                    <line class="interval" x1={x(interval[0])} x2={x(interval[1])} y1={y} y2={y} />
                  )}
                  {share !== null && <circle class="dot" cx={x(share)} cy={y} r="6" />}
                </g>
              );
            })}
          </svg>
        )}
      </div>
    </figure>
  );
}

const HEIGHT = 280;
const MOST = 60;

/**
 * Each discharge that put a promise to the test, against its firm figure: the range that was said as an
 * open box, what was given as a mark.
 */
export function DeliveredPicture({
  tested,
  zone,
}: {
  tested: readonly TestedOffer[];
  zone: string | null;
}) {
  const { ref, width } = useWidth<HTMLDivElement>();
  const shown = [...tested].sort((a, b) => a.begins.localeCompare(b.begins)).slice(-MOST);
  const shares = shown.flatMap((one) => [shareOf(one), one.energy_MWh_el.p10 / firmOf(one)]);
  const most = Math.ceil(Math.max(1.1, ...shares) * 20) * 5;
  const least = Math.floor(Math.min(0.9, ...shares) * 20) * 5;
  const step = most - least > 60 ? 20 : most - least > 30 ? 10 : 5;
  const up = Array.from({ length: Math.floor((most - least) / step) + 1 }, (_, i) => {
    const mark = Math.ceil(least / step) * step + i * step;
    return [mark, `${mark}`] as const;
  }).filter(([mark]) => mark <= most);
  const frame: Frame = { width, height: HEIGHT, left: 36, right: 8, top: 26, bottom: 28 };
  const y = scaleOf([least, most], [HEIGHT - frame.bottom, frame.top]);
  const x = scaleOf([-0.5, Math.max(3, shown.length) - 0.5], [frame.left, width - frame.right]);
  const wide = Math.min(26, (x(1) - x(0)) * 0.6);
  const every = Math.ceil(shown.length / Math.max(2, Math.floor(width / 70)));
  const short = shown.filter(({ kept }) => !kept.p90).length;
  return (
    <figure class="picture">
      <figcaption>
        What was given, against the firm figure (p90, the strong line): the box reaches to the
        hopeful one (p10), its dashes are the even one (p50); ◆ given, ▼ less than firm
      </figcaption>
      <div ref={ref}>
        {width > 0 && (
          <svg
            width={width}
            height={HEIGHT}
            role="img"
            aria-label={`${shown.length} discharges, ${short} of them short of the firm figure`}
          >
            <Axes
              {...{ frame, x, y, up }}
              across={shown.flatMap((one, i) =>
                i % every === 0 ? [[i, wallOf(zone, one.begins).date.slice(5)] as const] : [],
              )}
              upName="% of the firm MWh el"
            />
            <line
              class="promise"
              x1={frame.left}
              x2={width - frame.right}
              y1={y(100)}
              y2={y(100)}
            />
            {shown.map((one, i) => (
              <Delivered key={one.begins + one.no} {...{ one, wide, y }} at={x(i)} />
            ))}
          </svg>
        )}
      </div>
    </figure>
  );
}

const firmOf = ({ energy_MWh_el }: TestedOffer): number => Math.max(1e-6, energy_MWh_el.p90);
const shareOf = (one: TestedOffer): number => one.delivered_MWh_el / firmOf(one);

function Delivered({
  one,
  at,
  wide,
  y,
}: {
  one: TestedOffer;
  at: number;
  wide: number;
  y(value: number): number;
}) {
  const { p50, p10 } = one.energy_MWh_el;
  const of = (MWh: number) => y((100 * MWh) / firmOf(one));
  const left = at - wide / 2;
  const given = of(one.delivered_MWh_el);
  const r = Math.min(7, Math.max(4, wide * 0.3));
  const mark = one.kept.p90
    ? `M${at} ${given - r}L${at + r} ${given}L${at} ${given + r}L${at - r} ${given}Z`
    : `M${at - r} ${given - r}L${at + r} ${given - r}L${at} ${given + r}Z`;
  return (
    <g>
      <title>{`${fixed(one.delivered_MWh_el, 2)} of firm ${fixed(firmOf(one), 2)} MWh el`}</title>
      <rect class="open" x={left} width={wide} y={of(p10)} height={y(100) - of(p10)} />
      <line class="middle" x1={left} x2={left + wide} y1={of(p50)} y2={of(p50)} />
      <path class={one.kept.p90 ? 'given' : 'given short'} d={mark} />
    </g>
  );
}
