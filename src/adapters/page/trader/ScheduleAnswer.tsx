import { fixed, hoursText, MODE_WORDS, percent, power } from '../lib/format.js';
import { Unit } from '../parts/Unit.js';
import { Scrolled } from './Scrolled.js';
import { shortTime, spanWords } from './times.js';
import type { CheckedRun, ScheduleCheck, Short } from './wire.js';
import {
  causeWords,
  certaintyWords,
  chance,
  firstMinutesWords,
  NEAREST_REASON_WORDS,
} from './words.js';

export const MODE_NOUNS = { charge: 'charge', discharge: 'discharge', stand: 'stand' } as const;

/** Whether it holds, at one glance. */
export function ScheduleVerdict({ check }: { check: ScheduleCheck }) {
  const holds = check.probability >= check.certainty;
  return (
    <p class="verdict" role="status" data-holds={holds ? '' : undefined}>
      <strong data-field="verdict" class={holds ? undefined : 'care'}>
        {holds ? '● Holds' : '▲ Does not hold'}
      </strong>{' '}
      <span>
        <b data-field="probability">{chance(check.probability)}</b> that all is done as asked;{' '}
        {certaintyWords(check.certainty)} was asked for
      </span>
    </p>
  );
}

/** What came out of the check, in words. */
export function ScheduleFacts({ check, zone }: { check: ScheduleCheck; zone: string | null }) {
  const clock = (time: string) => shortTime(zone, time, Date.parse(check.time));
  const { p50, certain } = check.first_shortfall;
  return (
    <div class="closely">
      <dl class="facts">
        <dt>First short</dt>
        <dd data-field="first-short">
          {certain === null ? (
            'nothing, with that certainty'
          ) : (
            <ShortWords short={certain} clock={clock} />
          )}
        </dd>
        {p50 !== null && (
          <>
            <dt>Even odds</dt>
            <dd>
              <ShortWords short={p50} clock={clock} />
            </dd>
          </>
        )}
        {check.unmet.map((one) => (
          <Fact key={`${one.from}${one.cause}`} name="Not possible" care>
            {spanWords(one.from, one.to, clock)}: {causeWords(one.cause)},{' '}
            {fixed(one.missing_MW_el, 2)} MW and {fixed(one.MWh_el, 2)}
            <Unit name="MWh_el" /> less
          </Fact>
        ))}
        {check.unmet.length > 0 && (
          <Fact name="The stores alone">
            would carry it with {chance(check.stores_probability)}
          </Fact>
        )}
        <Fact name="Net, asked for">
          {fixed(Math.abs(check.planned_net_MWh_el), 2)}
          <Unit name="MWh_el" /> {netWay(check.planned_net_MWh_el)}, expected{' '}
          {fixed(Math.abs(check.expected_net_MWh_el), 2)}
          <Unit name="MWh_el" /> {netWay(check.expected_net_MWh_el)} with start-ups and standing
        </Fact>
        {check.runs.map((run) => (
          <Fact key={run.from} name={`${MODE_NOUNS[run.mode]} ${clock(run.from)}`}>
            {runWords(run, check.reserve_looked_hours, clock)}
          </Fact>
        ))}
      </dl>
    </div>
  );
}

function Fact({
  name,
  care,
  children,
}: {
  name: string;
  care?: boolean;
  children: preact.ComponentChildren;
}) {
  return (
    <>
      <dt>{name}</dt>
      <dd class={care ? 'care' : undefined}>{children}</dd>
    </>
  );
}

/** Above 0 the unit delivers, in a schedule. */
const netWay = (MWh: number): string => (MWh < 0 ? 'drawn' : 'delivered');

function ShortWords({
  short: { time, MWh_el, cause },
  clock,
}: {
  short: Short;
  clock(time: string): string;
}) {
  return (
    <>
      from {clock(time)}: {causeWords(cause)}; {fixed(MWh_el, 2)}
      <Unit name="MWh_el" /> lacking to the end of the run
    </>
  );
}

/** How long a run could go on, or by how much it is too long, and why. */
function runWords(run: CheckedRun, looked_h: number, clock: (time: string) => string): string {
  const { p90 } = run.reserve_hours;
  const reserve =
    p90 === null
      ? `firmly more than ${hoursText(looked_h)} to spare`
      : p90 >= 0
        ? `firmly ${hoursText(p90)} to spare`
        : `${hoursText(-p90)} too long to be firm`;
  const first = firstMinutesWords(run.first_minutes);
  return [
    `${chance(run.probability)}, ${reserve}`,
    run.ends_by !== null && `then ends by: ${causeWords(run.ends_by)}`,
    run.stops !== null && `stops at ${clock(run.stops)} on the most likely course`,
    first,
  ]
    .filter(Boolean)
    .join('; ');
}

/** The nearest schedule that holds, to be taken over. */
export function Nearest({
  check,
  zone,
  onUse,
}: {
  check: ScheduleCheck;
  zone: string | null;
  onUse(): void;
}) {
  if (check.probability >= check.certainty) return null;
  const { nearest, nearest_reason } = check;
  if (nearest === null) {
    return (
      <p class="nearest">
        No nearest schedule:{' '}
        {nearest_reason === null ? 'none was found' : NEAREST_REASON_WORDS[nearest_reason]}.
      </p>
    );
  }
  const clock = (time: string) => shortTime(zone, time, Date.parse(check.time));
  const changes = [
    nearest.factor_discharge < 1 &&
      `discharging powers at ${percent(nearest.factor_discharge, 1)} %`,
    nearest.factor_charge < 1 && `charging powers at ${percent(nearest.factor_charge, 1)} %`,
    ...nearest.drawn_in.map(
      ({ mode, asked, to }) => `the ${mode} ends at ${clock(to)} instead of ${clock(asked)}`,
    ),
    nearest.taken_out && 'what is not allowed is left out',
  ].filter((one) => one !== false);
  return (
    <div class="nearest">
      <h2>Nearest schedule that holds</h2>
      <p>
        {changes.length === 0 ? 'As asked' : changes.join('; ')}. It holds with{' '}
        <b>{chance(nearest.probability)}</b>.
      </p>
      <Scrolled label="Blocks of the nearest schedule">
        <table class="plain">
          <thead>
            <tr>
              <th scope="col">from</th>
              <th scope="col">to</th>
              <th scope="col">mode</th>
              <th scope="col">
                MW<sub>el</sub>
              </th>
            </tr>
          </thead>
          <tbody>
            {nearest.blocks.slice(0, 8).map((block) => (
              <tr key={block.from}>
                <td>{clock(block.from)}</td>
                <td>{clock(block.to)}</td>
                <td>{MODE_NOUNS[block.mode]}</td>
                <td>{power(block.power_MW_el)}</td>
              </tr>
            ))}
          </tbody>
        </table>
      </Scrolled>
      {nearest.blocks.length > 8 && <p>and {nearest.blocks.length - 8} more</p>}
      <p>
        <button type="button" data-action="use-nearest" onClick={onUse}>
          Use this schedule and check it
        </button>
      </p>
    </div>
  );
}

/** Block by block, what was asked for and what comes of it. */
export function BlockTable({ check, zone }: { check: ScheduleCheck; zone: string | null }) {
  const clock = (time: string) => shortTime(zone, time, Date.parse(check.time));
  const ramps = check.blocks.reduce((sum, { ramp_MWh_el }) => sum + ramp_MWh_el, 0);
  return (
    <Scrolled label="Blocks of the schedule">
      <table class="plain tight">
        <caption>
          Block by block, MWh<sub>el</sub> in the direction of the block
          {ramps > 0 && `; ${fixed(ramps, 2)} that start-ups take are no shortfall`}
        </caption>
        <thead>
          <tr>
            <th scope="col">block</th>
            <th scope="col">mode</th>
            <th scope="col">
              MW<sub>el</sub>
            </th>
            <th scope="col">asked</th>
            <th scope="col">{certaintyWords(check.certainty)}</th>
            <th scope="col">expected</th>
            <th scope="col">met</th>
          </tr>
        </thead>
        <tbody>
          {check.blocks.map((block) => (
            <tr
              key={block.from}
              data-short={block.met_probability < check.certainty ? '' : undefined}
            >
              <th scope="row">
                {clock(block.from)} – {clock(block.to)}
              </th>
              <td>{MODE_WORDS[block.mode]}</td>
              <td>{power(block.power_MW_el)}</td>
              <td>{fixed(block.planned_MWh_el, 2)}</td>
              <td>
                <strong>{fixed(block.certain_MWh_el, 2)}</strong>
              </td>
              <td>{fixed(block.expected_MWh_el, 2)}</td>
              <td>
                {block.met_probability < check.certainty && <span class="care">▲ </span>}
                {chance(block.met_probability)}
              </td>
            </tr>
          ))}
        </tbody>
      </table>
    </Scrolled>
  );
}

/** The blocks as rows of cells. */
export function scheduleRows(check: ScheduleCheck): (string | number)[][] {
  return [
    [
      'from',
      'to',
      'mode',
      'power_MW_el',
      'planned_MWh_el',
      `MWh_el at ${check.certainty * 100} %`,
      'expected_MWh_el',
      'met_probability',
    ],
    ...check.blocks.map((block) => [
      block.from,
      block.to,
      block.mode,
      block.power_MW_el,
      block.planned_MWh_el,
      block.certain_MWh_el,
      block.expected_MWh_el,
      block.met_probability,
    ]),
  ];
}
