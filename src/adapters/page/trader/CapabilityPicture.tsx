import { fixed, percent, power } from '../lib/format.js';
import { useWidth } from '../parts/useWidth.js';
import { Axes } from './Axes.js';
import { type Frame, pathOf, roundMarks, scaleOf } from './picture.js';
import type { Capability, CapabilityCurve } from './wire.js';
import { causeWords, POWER_LIMIT_WORDS } from './words.js';

const HEIGHT = 300;

/** Greatest power at a state of charge by the lines of a curve [MW]; null beyond them. */
export function greatestAt({ points }: CapabilityCurve, soc: number): number | null {
  const i = points.findIndex((point) => point.state_of_charge >= soc);
  const right = points[i];
  if (right === undefined) return null;
  const left = points[i - 1];
  if (left === undefined) return right.state_of_charge === soc ? right.power_MW_el : null;
  const share = (soc - left.state_of_charge) / (right.state_of_charge - left.state_of_charge);
  return left.power_MW_el + share * (right.power_MW_el - left.power_MW_el);
}

/** What can be given (up) and taken (down) at each state of charge, and where the unit is now. */
export function CapabilityPicture({ capability }: { capability: Capability }) {
  const { ref, width } = useWidth<HTMLDivElement>();
  const { discharge, charge, state_of_charge: soc } = capability;
  const gives = greatestAt(discharge, soc);
  const takes = greatestAt(charge, soc);
  const words = `Now, at ${percent(soc, 0)} %: gives up to ${fixed(gives, 2)} MW electric, takes up to ${fixed(takes, 2)} MW electric`;
  return (
    <>
      <p data-field="capability-now">{words}.</p>
      {[discharge, charge].map(
        ({ direction, refused }) =>
          refused !== null && (
            <p key={direction} class="care">
              ✕ No {direction}: {causeWords(refused)}
            </p>
          ),
      )}
      <figure class="picture">
        <figcaption>Given above the line, taken below it</figcaption>
        <div ref={ref}>{width > 0 && <Drawing {...{ capability, width, words }} />}</div>
      </figure>
      <details>
        <summary>Points of the curves</summary>
        <table class="plain">
          <thead>
            <tr>
              <th scope="col">direction</th>
              <th scope="col">charge, %</th>
              <th scope="col">
                MW<sub>el</sub>
              </th>
              <th scope="col">limited by</th>
            </tr>
          </thead>
          <tbody>
            {[discharge, charge].flatMap(({ direction, points }) =>
              points.map((point) => (
                <tr key={`${direction}${point.state_of_charge}`}>
                  <td>{direction}</td>
                  <td>{percent(point.state_of_charge, 1)}</td>
                  <td>{power(point.power_MW_el)}</td>
                  <td>{POWER_LIMIT_WORDS[point.limited_by]}</td>
                </tr>
              )),
            )}
          </tbody>
        </table>
      </details>
    </>
  );
}

function Drawing({
  capability,
  width,
  words,
}: {
  capability: Capability;
  width: number;
  words: string;
}) {
  const { discharge, charge, state_of_charge: soc } = capability;
  const all = [...discharge.points, ...charge.points];
  const from = Math.min(0, ...all.map((point) => point.state_of_charge));
  const to = Math.max(1, ...all.map((point) => point.state_of_charge));
  const most = Math.max(0.1, ...discharge.points.map(({ power_MW_el }) => power_MW_el)) * 1.15;
  const least = -Math.max(0.1, ...charge.points.map(({ power_MW_el }) => power_MW_el)) * 1.15;
  const frame: Frame = { width, height: HEIGHT, left: 36, right: 16, top: 26, bottom: 40 };
  const x = scaleOf([from, to], [frame.left, width - frame.right]);
  const y = scaleOf([least, most], [HEIGHT - frame.bottom, frame.top]);
  const step = roundMarks(most - least, 6)[1]!;
  const up: [number, string][] = [];
  for (let at = Math.ceil(least / step) * step; at <= most; at += step) {
    const mark = Number(at.toPrecision(12));
    up.push([mark, mark < 0 ? `−${-mark}` : `${mark}`]);
  }
  const across = Array.from({ length: Math.floor(to / 0.25 + 1e-9) + 1 }, (_, i) => i * 0.25);
  const area = ({ points }: CapabilityCurve, sign: 1 | -1) => {
    const [first, last] = [points[0], points.at(-1)];
    if (first === undefined || last === undefined) return null;
    const edge = points.map(
      (point) => [x(point.state_of_charge), y(sign * point.power_MW_el)] as const,
    );
    return {
      edge: pathOf(edge),
      area: `${pathOf([[x(first.state_of_charge), y(0)], ...edge, [x(last.state_of_charge), y(0)]])}Z`,
    };
  };
  return (
    <svg width={width} height={HEIGHT} role="img" aria-label={words}>
      <Axes
        {...{ frame, x, y, up }}
        across={across.map((value) => [value, `${value * 100}`])}
        upName="MW_el"
        acrossName="state of charge, %"
      />
      {[area(discharge, 1), area(charge, -1)].map(
        (curve) =>
          curve !== null && (
            <g key={curve.edge}>
              <path class="band" d={curve.area} />
              <path class="firm" d={curve.edge} />
            </g>
          ),
      )}
      <line class="zero" x1={frame.left} x2={width - frame.right} y1={y(0)} y2={y(0)} />
      <text x={x(from) + 8} y={y(0) - 10}>
        gives
      </text>
      <text x={x(from) + 8} y={y(0) + 20}>
        takes
      </text>
      <g class="present">
        <line x1={x(soc)} x2={x(soc)} y1={frame.top - 6} y2={HEIGHT - frame.bottom} />
        <text class="figure" x={x(soc) + 6} y={frame.top + 2}>
          now
        </text>
      </g>
    </svg>
  );
}
