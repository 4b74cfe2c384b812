import { signal } from '@preact/signals';
import { Fragment } from 'preact';
import { useEffect, useState } from 'preact/hooks';
import { fixed, hoursText, power } from '../lib/format.js';
import { api, model } from '../lib/page.js';
import { Unit } from '../parts/Unit.js';
import { Asking } from './asking.js';
import { CapabilityPicture } from './CapabilityPicture.js';
import { Scrolled } from './Scrolled.js';
import { Awaited, StandsOn } from './Standing.js';
import { Field } from './TableForm.js';
import { csvOf, Take, tabsOf } from './Take.js';
import { TradePicture } from './TradePicture.js';
import { powersText, readPowers } from './tableAsk.js';
import {
  type Capability,
  definitionOf,
  type Headroom,
  type HeadroomAnswer,
  type TraderDefinition,
} from './wire.js';
import { causeWords, firstMinutesWords } from './words.js';

const headroomAsking = new Asking<Headroom>();
const capabilityAsking = new Asking<Capability>();
const powers = signal<string | null>(null);
const chosen = signal<number | null>(null);

/** Powers to charge at that are worth a look: the greatest, the rated one, and one between. */
export function usualChargePowers({
  limits,
  rated_power_MW_el: rated,
}: Pick<TraderDefinition, 'limits' | 'rated_power_MW_el'>): number[] {
  const most = limits.charge.power_max_MW_el;
  const least = limits.charge.power_min_MW_el;
  const powers = [most, (most + Math.min(rated, most)) / 2, rated, (rated + least) / 2];
  const sound = powers
    .map((power) => Number(power.toPrecision(2)))
    .filter((power) => power > 0 && power >= least && power <= most);
  return [...new Set([most, ...sound])].sort((a, b) => b - a);
}

/** So many the server works out at once. */
const MOST_POWERS = 8;

/** What can still be charged, at which power, for how long; and the curve of what is possible. */
export function ChargePart() {
  const [fault, setFault] = useState<string | null>(null);
  const entry = model.unit.value;
  const definition = definitionOf(entry);
  const unit = entry?.unit ?? '';
  const known = entry?.state?.estimate != null;
  const asked = headroomAsking.of(unit);
  // Never by itself again: not after a fault, nor after somebody gave up.
  const fresh = asked.unit === null;
  const ask = (text: string) => {
    const read = readPowers(text, MOST_POWERS);
    setFault(typeof read === 'string' ? read : null);
    if (typeof read === 'string') return;
    const query = { power_MW: read.join(','), stale: 'mark' };
    void headroomAsking.ask(unit, async (ended) => {
      return api.ahead<Headroom>(api.path(unit, 'headroom'), { query }, ended);
    });
  };
  const text =
    powers.value ?? (definition === null ? '' : powersText(usualChargePowers(definition)));
  useEffect(() => {
    if (definition !== null && known && fresh) ask(text);
  }, [definition, known, fresh]);
  if (definition === null) return null;
  const { answer: headroom } = asked;
  return (
    <>
      <form
        class="ask"
        onSubmit={(event) => {
          event.preventDefault();
          ask(text);
        }}
      >
        <Field id="offer-charging" label="Charging powers, MW electric" wide>
          <input
            id="offer-charging"
            name="charging"
            value={text}
            inputMode="decimal"
            aria-invalid={fault === null ? undefined : 'true'}
            onInput={(event) => {
              powers.value = event.currentTarget.value;
            }}
          />
        </Field>
        <button type="submit" class="main">
          {asked.since_ms === null ? 'Ask' : 'Ask this instead'}
        </button>
        <p class="fault" role="alert">
          {fault ?? ''}
        </p>
      </form>
      <Awaited asked={asked} usual="about 2 s" onCancel={() => headroomAsking.cancel()} />
      {headroom !== null && (
        <div aria-busy={asked.since_ms !== null}>
          <StandsOn asked={asked} onAsk={() => ask(text)} />
          <HeadroomView headroom={headroom} />
          <Take
            name={`${unit}-headroom.csv`}
            csv={() => csvOf(headroomRows(headroom))}
            text={() => tabsOf(headroomRows(headroom))}
          />
        </div>
      )}
      <CapabilityView unit={unit} />
    </>
  );
}

function HeadroomView({ headroom }: { headroom: Headroom }) {
  const { answers } = headroom;
  const one = answers.find(({ power_MW_el }) => power_MW_el === chosen.value) ?? answers[0];
  return (
    <div class="charge-view">
      <Scrolled label="Figures by charging power">
        <table class="plain roomy">
          <caption>
            Large: MWh<sub>el</sub> it takes from the grid at least, firm (nine in ten); then how
            long, and even (p50) and hopeful (p10)
          </caption>
          <thead>
            <tr>
              <th scope="col">at</th>
              <th scope="col">firm</th>
              <th scope="col">for</th>
              <th scope="col">p50 · p10</th>
              <th scope="col">ends by</th>
            </tr>
          </thead>
          <tbody>
            {answers.map((answer) => (
              <Fragment key={answer.power_MW_el}>
                <tr data-charge={answer.power_MW_el}>
                  <th scope="row">
                    <button
                      type="button"
                      aria-pressed={answer === one}
                      onClick={() => {
                        chosen.value = answer.power_MW_el;
                      }}
                    >
                      {power(answer.power_MW_el)}
                      <Unit name="MW_el" />
                    </button>
                  </th>
                  <HeadroomCells answer={answer} />
                </tr>
                <Limits answer={answer} />
              </Fragment>
            ))}
          </tbody>
        </table>
      </Scrolled>
      <TradePicture
        points={answers
          .filter(({ refused }) => refused === null)
          .map(({ power_MW_el, hours, energy_MWh_el }) => ({
            ...{ power_MW_el, hours, firm_h: hours.p90, firm_MWh_el: energy_MWh_el.p90 },
          }))}
        certainty={0.9}
        chosen_MW={one?.power_MW_el ?? null}
        title="How long it can still charge at which power"
      />
    </div>
  );
}

function HeadroomCells({ answer }: { answer: HeadroomAnswer }) {
  const { hours, energy_MWh_el, refused } = answer;
  if (refused !== null) {
    return (
      <td colSpan={4}>
        <span class="care">✕ refused: {causeWords(refused)}</span>
      </td>
    );
  }
  return (
    <>
      <td>
        <strong data-field="headroom">{fixed(energy_MWh_el.p90, 2)}</strong>
      </td>
      <td class="whole">{hoursText(hours.p90)}</td>
      <td class="whole">
        {fixed(energy_MWh_el.p50, 2)} · {fixed(energy_MWh_el.p10, 2)}
      </td>
      <td>
        {answer.ends_by === null ? 'nothing in the time looked ahead' : chargeEnd(answer.ends_by)}
      </td>
    </>
  );
}

/** What limits a power, in a row of its own: words need the width of the table. */
function Limits({ answer }: { answer: HeadroomAnswer }) {
  const { limited_by, derated_after_hours, derated_to_MW_el: to_MW } = answer;
  if (answer.refused !== null) return null;
  const notes = [
    limited_by !== null && causeWords(limited_by),
    derated_after_hours !== null &&
      `takes less after ${hoursText(derated_after_hours)}${
        to_MW === null ? '' : `, down to ${power(Number(to_MW.toPrecision(3)))} MW electric`
      }: greatest flow`,
    firstMinutesWords(answer.first_minutes),
  ].filter((one) => typeof one === 'string');
  if (notes.length === 0) return null;
  return (
    <tr class="limits">
      <td colSpan={5}>
        {notes.map((note) => (
          <small key={note} class="care">
            ▲ {note}
          </small>
        ))}
      </td>
    </tr>
  );
}

/** A charge ends where the warm or cold front comes through: not as a discharge does. */
function chargeEnd(cause: NonNullable<HeadroomAnswer['ends_by']>): string {
  if (cause === 'hot_outlet') return 'hot store full';
  if (cause === 'cold_outlet') return 'cold store full';
  return causeWords(cause);
}

function CapabilityView({ unit }: { unit: string }) {
  const asked = capabilityAsking.of(unit);
  const { answer } = asked;
  const ask = () =>
    void capabilityAsking.ask(unit, async (ended) => {
      const query = { stale: 'mark' };
      return api.ahead<Capability>(api.path(unit, 'capability'), { query }, ended);
    });
  return (
    <section class="capability" aria-labelledby="capability-title">
      <h2 id="capability-title">Greatest power both ways, against state of charge</h2>
      <p class="help">
        For an optimiser: the greatest power at each state of charge, with the fronts where a full
        charge from now would leave them. For the energy from now on take the figures above.
      </p>
      {answer === null && asked.since_ms === null && (
        <p>
          <button type="button" onClick={ask} data-action="capability">
            Draw the curve
          </button>
        </p>
      )}
      <Awaited asked={asked} usual="2 to 5 s" onCancel={() => capabilityAsking.cancel()} />
      {answer !== null && (
        <div aria-busy={asked.since_ms !== null}>
          <StandsOn asked={asked} onAsk={ask} />
          <CapabilityPicture capability={answer} />
          {answer.cycle !== null && (
            <p>
              The way back: of each MWh<sub>el</sub> taken{' '}
              <strong>{fixed(answer.cycle.round_trip, 2)}</strong> come back in a cycle from limit
              to limit.
            </p>
          )}
          <Take
            name={`${unit}-capability.csv`}
            csv={() => csvOf(capabilityRows(answer))}
            text={() => tabsOf(capabilityRows(answer))}
          />
        </div>
      )}
    </section>
  );
}

function headroomRows({ answers }: Headroom): (string | number | null)[][] {
  return [
    [
      ...['power_MW_el', 'p90_MWh_el', 'p50_MWh_el', 'p10_MWh_el', 'p90_hours', 'p50_hours'],
      ...['p10_hours', 'ends_by', 'limited_by', 'refused'],
    ],
    ...answers.map(({ power_MW_el, energy_MWh_el, hours, ends_by, limited_by, refused }) => [
      ...[power_MW_el, energy_MWh_el.p90, energy_MWh_el.p50, energy_MWh_el.p10],
      ...[hours.p90, hours.p50, hours.p10, ends_by, limited_by, refused],
    ]),
  ];
}

function capabilityRows({ discharge, charge }: Capability): (string | number)[][] {
  return [
    ['direction', 'state_of_charge', 'power_MW_el', 'limited_by', 'energy_MWh_el'],
    ...[discharge, charge].flatMap(({ direction, points }) =>
      points.map((point) => [
        direction,
        point.state_of_charge,
        point.power_MW_el,
        point.limited_by,
        point.energy_MWh_el,
      ]),
    ),
  ];
}
