import type { ComponentChildren } from 'preact';
import {
  DASH,
  fixed,
  flowWay,
  hoursText,
  LIMIT_WORDS,
  MODE_WORDS,
  percent,
  power,
  powerWay,
  QUALITY_WORDS,
} from '../lib/format.js';
import type { UnitEntry } from '../lib/model.js';
import type { Answer } from '../lib/useAnswer.js';
import type { AskedHeadroom, AskedHours } from '../lib/wire.js';
import { ChargeBar } from '../parts/ChargeBar.js';
import { Unit } from '../parts/Unit.js';
import { configuredNow, nearestToRated } from './asked.js';

const size = (value: number | null | undefined): number | null =>
  value === null || value === undefined ? null : Math.abs(value);

function Figure({
  field,
  label,
  value,
  unit,
  under,
  children,
}: {
  field: string;
  label: string;
  value: string;
  unit?: string;
  under?: string;
  children?: ComponentChildren;
}) {
  return (
    <div data-figure={field}>
      <dt>{label}</dt>
      <dd>
        <span data-field={field}>{value}</span>
        {unit !== undefined && <Unit name={unit} />}
        {children}
        <small>{under}</small>
      </dd>
    </div>
  );
}

/**
 * The four figures that count, large; those that explain them, small.
 *
 * @param present hours at the power that is delivered now, null while none is
 */
export function Figures({
  entry,
  present,
  headroom,
}: {
  entry: UnitEntry | null;
  present: AskedHours | null;
  headroom: Answer<AskedHeadroom>;
}) {
  const state = entry?.state ?? null;
  const estimate = state?.estimate ?? null;
  const definition = entry?.definition ?? null;
  const now = configuredNow(entry) ?? present?.answers[0] ?? null;
  const firm = now ?? nearestToRated(entry);
  const atRated = nearestToRated(entry);
  const take = headroom.answer?.answers[0] ?? null;
  const charge = estimate?.state_of_charge ?? null;
  const awaited = estimate === null ? '' : 'not worked out yet';
  return (
    <section id="figures" aria-label="Figures">
      <dl class="great">
        <Figure
          field="soc"
          label="State of charge"
          value={percent(charge)}
          unit="%"
          under={
            definition === null
              ? ''
              : `of ${fixed(definition.rated_power_MW_el * definition.rated_hours, 1)} MWh electric, rated`
          }
        >
          <ChargeBar charge={charge} />
        </Figure>
        <Figure
          field="firm-hours"
          label="Firm hours"
          value={hoursText(firm?.hours.p90)}
          under={
            firm === null
              ? awaited
              : `p90 at ${power(firm.power_MW)} MW electric${now === null ? '' : ', as now'}`
          }
        />
        <Figure
          field="dispatchable"
          label="Dispatchable, firm"
          value={fixed(atRated?.energy_MWh_el.p90, 2)}
          unit="MWh_el"
          under={atRated === null ? awaited : `p90 at ${power(atRated.power_MW)} MW electric`}
        />
        <Figure
          field="mode"
          label="Mode"
          value={estimate === null ? DASH : MODE_WORDS[estimate.mode]}
        />
      </dl>
      <dl class="strip">
        <Figure
          field="power"
          label="Net power"
          value={fixed(size(state?.power_MW_el), 2)}
          unit="MW_el"
          under={powerWay(state?.power_MW_el)}
        />
        <Figure
          field="flow"
          label="Flow"
          value={fixed(size(state?.flow_kg_s), 1)}
          unit="kg/s"
          under={flowWay(state?.flow_kg_s)}
        />
        <Figure
          field="headroom"
          label="Can still take, firm"
          value={fixed(take?.energy_MWh_el.p90, 2)}
          unit="MWh_el"
          under={headroomWords(headroom)}
        />
        <Figure
          field="quality"
          label="Estimate"
          value={estimate?.quality ?? DASH}
          under={estimate === null ? '' : (QUALITY_WORDS[estimate.quality].split(': ')[1] ?? '')}
        />
      </dl>
    </section>
  );
}

/** What the figure is of; without one, whether it is on its way. */
function headroomWords({ answer: headroom, asking, fault }: Answer<AskedHeadroom>): string {
  const answer = headroom?.answers[0] ?? null;
  if (answer === null || headroom === null) {
    if (fault !== null) return 'not known: the server gave no answer';
    return asking ? 'being worked out' : '';
  }
  if (answer.refused !== null) return answer.refused;
  const limit = answer.limited_by === null ? '' : `, ${LIMIT_WORDS[answer.limited_by]}`;
  const old = headroom.stale ? ', from a stale estimate' : '';
  return `${hoursText(answer.hours.p90)} at ${power(answer.power_MW_el)} MW electric${limit}${old}`;
}
