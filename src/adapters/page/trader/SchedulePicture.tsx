import { useWidth } from '../parts/useWidth.js';
import { Axes, Hatch } from './Axes.js';
import { type Frame, pathOf, roundMarks, type Scale, scaleOf } from './picture.js';
import { clockIn, hourMarks } from './times.js';
import type { CheckedBlock, ScheduleCheck, Short } from './wire.js';

const HEIGHT = 380;
const POWER_BOTTOM = 150;
/** Between 10 and 90 % of a normal distribution, in sigma. */
const TO_P90 = 1.2816;

/** The schedule as steps of power and the state of charge along it, what is short hatched. */
export function SchedulePicture({ check, zone }: { check: ScheduleCheck; zone: string | null }) {
  const { ref, width } = useWidth<HTMLDivElement>();
  return (
    <figure class="picture">
      <figcaption>
        Power asked for, with what is not sure enough hatched, and the state of charge along it
        (grey: eight of ten)
      </figcaption>
      <div ref={ref}>{width > 0 && <Drawing {...{ check, zone, width }} />}</div>
    </figure>
  );
}

const signed = ({ mode, power_MW_el }: Pick<CheckedBlock, 'mode' | 'power_MW_el'>): number =>
  mode === 'charge' ? -power_MW_el : mode === 'discharge' ? power_MW_el : 0;

function Drawing({
  check,
  zone,
  width,
}: {
  check: ScheduleCheck;
  zone: string | null;
  width: number;
}) {
  const begin = Date.parse(check.time);
  const end = Math.max(...check.blocks.map(({ to }) => Date.parse(to)));
  const frame: Frame = { width, height: HEIGHT, left: 42, right: 22, top: 26, bottom: 28 };
  const x = scaleOf([begin, end], [frame.left, width - frame.right]);
  const marks = hourMarks(zone, begin, end, width < 500 ? 5 : 12);
  const powers = check.blocks.map(signed);
  const most = Math.max(0.1, ...powers) * 1.15;
  const least = Math.min(0, ...powers) * 1.15;
  const power = scaleOf([least, most], [POWER_BOTTOM, frame.top]);
  const step = roundMarks(Math.max(most, -least), 2)[1]!;
  const upPower: [number, string][] = [];
  for (let at = Math.ceil(least / step) * step; at <= most + 1e-9; at += step) {
    const mark = Number(at.toPrecision(12));
    upPower.push([mark, `${Math.abs(mark)}`]);
  }
  const charge = check.charge.map((point) => ({
    at: Date.parse(point.time),
    soc: point.state_of_charge * 100,
    wide: point.state_of_charge_sigma * 100 * TO_P90,
  }));
  const full = Math.max(100, ...charge.map(({ soc, wide }) => soc + wide));
  const percent = scaleOf([0, full], [HEIGHT - frame.bottom, POWER_BOTTOM + 44]);
  const line = (of: (point: (typeof charge)[number]) => number) =>
    charge.map((point) => [x(point.at), percent(of(point))] as const);
  const band = [
    ...line(({ soc, wide }) => soc + wide),
    ...line(({ soc, wide }) => Math.max(0, soc - wide)).reverse(),
  ];
  const short = check.first_shortfall.certain;
  const ends = charge.at(-1);
  return (
    <svg width={width} height={HEIGHT} role="img" aria-label={wordsOf(check, zone)}>
      <Hatch id="short-hatch" />
      <Axes
        frame={{ ...frame, height: POWER_BOTTOM + frame.bottom }}
        x={x}
        y={power}
        across={[]}
        up={upPower}
        upName="MW_el, delivered above, drawn below"
      />
      <Axes
        frame={{ ...frame, top: POWER_BOTTOM + 44 }}
        x={x}
        y={percent}
        across={marks}
        up={[0, 50, 100].map((value) => [value, `${value}`])}
        upName="state of charge, %"
      />
      {check.blocks.map((block) => (
        <Step key={block.from} {...{ block, x, power }} />
      ))}
      <line class="zero" x1={frame.left} x2={width - frame.right} y1={power(0)} y2={power(0)} />
      <path class="band" d={`${pathOf(band)}Z`} />
      <path class="firm" d={pathOf(line(({ soc }) => soc))} />
      {charge.length <= 30 &&
        charge.map(({ at, soc }) => (
          <circle key={at} class="dot" cx={x(at)} cy={percent(soc)} r="2.5" />
        ))}
      {ends !== undefined && (
        <text class="figure" x={x(ends.at) - 4} y={percent(ends.soc) - 10} text-anchor="end">
          {Math.round(ends.soc)} %
        </text>
      )}
      {check.unmet.map((one) => (
        <Missing
          key={`${one.from}${one.cause}`}
          from={x(Date.parse(one.from))}
          to={x(Date.parse(one.to))}
          between={lackOf(check.blocks[one.block], one.missing_MW_el, power)}
        />
      ))}
      {check.blocks.map((block) => {
        const from = unsureFrom(block);
        return from === null ? null : (
          <Missing
            key={block.from}
            from={x(from)}
            to={x(Date.parse(block.to))}
            between={spanOf(block, power)}
          />
        );
      })}
      {short !== null && <ShortFrom {...{ short, x, zone, frame }} />}
    </svg>
  );
}

function spanOf(block: CheckedBlock | undefined, power: Scale): [number, number] {
  const own = power(block === undefined ? 0 : signed(block));
  return [Math.min(own, power(0)), Math.max(own, power(0))];
}

function Step({ block, x, power }: { block: CheckedBlock; x: Scale; power: Scale }) {
  const [top, bottom] = spanOf(block, power);
  const left = x(Date.parse(block.from));
  return (
    <rect
      class={`energy ${block.mode}`}
      x={left}
      width={Math.max(1, x(Date.parse(block.to)) - left)}
      y={top}
      height={Math.max(1.5, bottom - top)}
    />
  );
}

function Missing({
  from,
  to,
  between: [top, bottom],
}: {
  from: number;
  to: number;
  between: [number, number];
}) {
  return (
    <g class="missing">
      <rect class="ground" x={from} width={Math.max(2, to - from)} y={top} height={bottom - top} />
      <rect
        fill="url(#short-hatch)"
        x={from}
        width={Math.max(2, to - from)}
        y={top}
        height={bottom - top}
      />
    </g>
  );
}

/** What of a block's power machine, connection or an outage do not allow. */
function lackOf(
  block: CheckedBlock | undefined,
  missing_MW: number,
  power: Scale,
): [number, number] {
  const own = block === undefined ? 0 : signed(block);
  const left = Math.sign(own) * Math.max(0, Math.abs(own) - missing_MW);
  return [Math.min(power(own), power(left)), Math.max(power(own), power(left))];
}

/** From when on a block is not sure enough, as its missing energy at its end; null: it is all sure. */
export function unsureFrom(block: CheckedBlock): number | null {
  const { planned_MWh_el, certain_MWh_el, unmet_MWh_el, ramp_MWh_el } = block;
  if (block.mode === 'stand' || planned_MWh_el <= 0) return null;
  const lacks = (planned_MWh_el - unmet_MWh_el - ramp_MWh_el - certain_MWh_el) / planned_MWh_el;
  if (lacks < 0.002) return null;
  const from = Date.parse(block.from);
  const to = Date.parse(block.to);
  // A block of which nothing is sure has no sure beginning, not even that of its ramp.
  if (certain_MWh_el < 0.002 * planned_MWh_el) return from;
  return to - Math.min(1, lacks) * (to - from);
}

/** When it first falls short, over both pictures, with a word and the time. */
function ShortFrom({
  short,
  x,
  zone,
  frame,
}: {
  short: Short;
  x: Scale;
  zone: string | null;
  frame: Frame;
}) {
  const at = Date.parse(short.time);
  const late = x(at) > frame.width * 0.6;
  return (
    <g class="short">
      <line x1={x(at)} x2={x(at)} y1={frame.top - 8} y2={HEIGHT - frame.bottom} />
      <text x={x(at) + (late ? -6 : 6)} y={POWER_BOTTOM + 20} text-anchor={late ? 'end' : 'start'}>
        ▲ short from {clockIn(zone, at)}
      </text>
    </g>
  );
}

function wordsOf(check: ScheduleCheck, zone: string | null): string {
  const blocks = check.blocks
    .map(
      ({ mode, power_MW_el, from, to }) =>
        `${mode} ${power_MW_el} MW from ${clockIn(zone, from)} to ${clockIn(zone, to)}`,
    )
    .slice(0, 12)
    .join(', ');
  const charge = [check.charge[0], check.charge.at(-1)]
    .map((point) => (point === undefined ? '–' : `${Math.round(point.state_of_charge * 100)} %`))
    .join(' to ');
  const short = check.first_shortfall.certain;
  const ends = short === null ? 'nothing is short' : `short from ${clockIn(zone, short.time)}`;
  return `${blocks}; charge from ${charge}; ${ends}`;
}
