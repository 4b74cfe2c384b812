import {
  ageText,
  DASH,
  fixed,
  hoursText,
  MODE_WORDS,
  percent,
  power,
  powerWay,
} from '../lib/format.js';
import { ageNow, type UnitEntry } from '../lib/model.js';
import { model, select } from '../lib/page.js';
import { hrefOf } from '../lib/route.js';
import { isOld, TRUST_WORDS, trustOf } from '../lib/trust.js';
import { verdictOf } from '../lib/verdict.js';
import type { LeftOut } from '../lib/wire.js';
import { ChargeBar } from '../parts/ChargeBar.js';
import { Unit } from '../parts/Unit.js';
import { VerdictSign } from '../parts/VerdictSign.js';
import { leftOutVerdict, siteVerdict, verdictsOf } from './siteVerdict.js';

/** Up to so many units the rows are tall, and beyond so many as low as they may be. */
const FEW = 6;
const MANY = 16;

function goTo(event: MouseEvent, unit: string): void {
  if (event.ctrlKey || event.metaKey || event.shiftKey) return;
  event.preventDefault();
  select(unit);
  location.hash = hrefOf('now');
}

/** All units at one look: a row for each, always in the same place. */
export function SiteSheet() {
  const units = model.units.value;
  const leftOut = model.leftOut.value;
  const size = units.length <= FEW ? 'few' : units.length <= MANY ? 'some' : 'many';
  const told = siteVerdict([
    ...verdictsOf(model.connection.value, units, model.standing.value),
    ...leftOut.map(leftOutVerdict),
  ]);
  return (
    <section id="all-units" aria-labelledby="all-units-head" data-size={size}>
      <h1 id="all-units-head">All units</h1>
      <div id="verdict" role="status" data-level={told.level}>
        <VerdictSign level={told.level} />
        <p>
          <strong data-field="verdict">{told.words}</strong>
          <span class="because">{told.because}</span>
        </p>
      </div>
      <table class="units">
        <thead>
          <tr>
            <th scope="col">Unit</th>
            <th scope="col">Mode</th>
            <th scope="col" colSpan={2}>
              State of charge
            </th>
            <th scope="col" class="number">
              Firm hours
            </th>
            <th scope="col" class="number">
              Firm
              <Unit name="MWh_el" />
            </th>
            <th scope="col" class="number">
              Net
              <Unit name="MW_el" />
            </th>
            <th scope="col" class="well">
              Is all well?
            </th>
            <th scope="col" class="number">
              Age
            </th>
          </tr>
        </thead>
        <tbody>
          {units.map((entry) => (
            <UnitRow key={entry.unit} entry={entry} />
          ))}
          {leftOut.map((one) => (
            <LeftOutRow key={one.unit} unit={one} />
          ))}
        </tbody>
      </table>
    </section>
  );
}

function UnitRow({ entry }: { entry: UnitEntry }) {
  const trust = trustOf(model.connection.value, entry);
  const own = model.standing.value.filter((event) => event.unit === entry.unit);
  const { level, words } = verdictOf(trust, entry, own);
  const estimate = entry.state?.estimate ?? null;
  const charge = estimate?.state_of_charge ?? null;
  const answers = entry.state?.dispatch?.answers ?? [];
  const firm = answers.find((one) => one.power_MW === entry.firmPower_MW) ?? answers[0] ?? null;
  const delivered = entry.state?.power_MW_el ?? null;
  return (
    <tr data-unit-row={entry.unit} data-level={level} data-old={isOld(trust) ? '' : undefined}>
      <th scope="row">
        <a
          href={`?unit=${encodeURIComponent(entry.unit)}${hrefOf('now')}`}
          onClick={(event) => goTo(event, entry.unit)}
        >
          {entry.name}
        </a>
      </th>
      <td data-cell="mode">{estimate === null ? DASH : MODE_WORDS[estimate.mode]}</td>
      <td class="bar-cell">
        <ChargeBar charge={charge} />
      </td>
      <td class="number" data-cell="soc">
        {percent(charge, 0)}
        <Unit name="%" />
      </td>
      <td class="number" data-cell="hours">
        {hoursText(firm?.hours.p90)}
        {firm !== null && (
          <small>
            {`at ${power(firm.power_MW)}`}
            <Unit name="MW_el" />
          </small>
        )}
      </td>
      <td class="number" data-cell="energy">
        {fixed(firm?.energy_MWh_el.p90, 2)}
        <span class="narrow">
          <Unit name="MWh_el" />
        </span>
      </td>
      <td class="number" data-cell="power">
        {fixed(delivered === null ? null : Math.abs(delivered), 2)}
        <span class="narrow">
          <Unit name="MW_el" />
        </span>
        <small>{powerWay(delivered)}</small>
      </td>
      <td class="well" data-cell="well">
        <VerdictSign level={level} />
        <span>{level === 'unknown' ? TRUST_WORDS[trust] : words}</span>
      </td>
      <Age entry={entry} />
    </tr>
  );
}

/** Faults that are listed in a row; the log and `rockhour check` have them all. */
const FAULTS_MOST = 3;

/** A unit that is not run: why, in place of figures. */
function LeftOutRow({ unit: { unit, name, faults } }: { unit: LeftOut }) {
  const { level, words } = leftOutVerdict({ unit, name, faults });
  const more = faults.length - FAULTS_MOST;
  return (
    <tr data-unit-row={unit} data-level={level} data-left-out="">
      <th scope="row">{name}</th>
      <td class="left-out" colSpan={6}>
        <ul>
          {faults.slice(0, FAULTS_MOST).map(({ path, line, found, expected }) => (
            <li key={path}>
              {line !== null && `line ${line}: `}
              <code>{path}</code>: found {found}, expected {expected}
            </li>
          ))}
          {more > 0 && <li>and {more} more: rockhour check lists them</li>}
        </ul>
      </td>
      <td class="well" data-cell="well">
        <VerdictSign level={level} />
        <span>{words}</span>
      </td>
      <td class="number" data-cell="age">
        {DASH}
      </td>
    </tr>
  );
}

/** On its own, so that a second's tick draws an age and no row. */
function Age({ entry }: { entry: UnitEntry }) {
  const age_s = ageNow(entry, model.tick_ms.value);
  return (
    <td class="number" data-cell="age">
      {age_s === null ? DASH : ageText(age_s)}
      {age_s !== null && <span class="narrow"> old</span>}
    </td>
  );
}
