import type { ComponentChildren } from 'preact';
import {
  DASH,
  fixed,
  hoursText,
  LIMIT_WORDS,
  MODE_WORDS,
  percent,
  power,
  QUALITY_WORDS,
} from '../lib/format.js';
import type { UnitEntry } from '../lib/model.js';
import type { AskedHeadroom, AskedHours } from '../lib/wire.js';
import { ChargeBar } from '../parts/ChargeBar.js';
import { Unit } from '../parts/Unit.js';
import { configuredNow, nearestToRated } from './asked.js';

/** Flow and power are positive while charging: what the sign means, in words. */
export function bySign(
  value: number | null | undefined,
  positive: string,
  negative: string,
): string {
  if (value === null || value === undefined || value === 0) return '';
  return value > 0 ? positive : negative;
}

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
  headroom: AskedHeadroom | null;
}) {
  const state = entry?.state ?? null;
  const estimate = state?.estimate ?? null;
  const definition = entry?.definition ?? null;
  const now = configuredNow(entry) ?? present?.answers[0] ?? null;
  const firm = now ?? nearestToRated(entry);
  const atRated = nearestToRated(entry);
  const take = headroom?.answers[0] ?? null;
  const charge = estimate?.state_of_charge ?? null;
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
              ? ''
              : `p90 at ${power(firm.power_MW)} MW electric${now === null ? '' : ', as now'}`
          }
        />
        <Figure
          field="dispatchable"
          label="Dispatchable, firm"
          value={fixed(atRated?.energy_MWh_el.p90, 2)}
          unit="MWh_el"
          under={atRated === null ? '' : `p90 at ${power(atRated.power_MW)} MW electric`}
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
          value={fixed(state?.power_MW_el, 2)}
          unit="MW_el"
          under={bySign(state?.power_MW_el, 'drawn to charge', 'delivered')}
        />
        <Figure
          field="flow"
          label="Flow"
          value={fixed(state?.flow_kg_s, 1)}
          unit="kg/s"
          under={bySign(state?.flow_kg_s, 'charging way', 'discharging way')}
        />
        <Figure
          field="headroom"
          label="Can still take, firm"
          value={fixed(take?.energy_MWh_el.p90, 2)}
          unit="MWh_el"
          under={headroomWords(take, headroom?.stale ?? false)}
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

function headroomWords(answer: AskedHeadroom['answers'][number] | null, stale: boolean): string {
  if (answer === null) return '';
  if (answer.refused !== null) return answer.refused;
  const limit = answer.limited_by === null ? '' : `, ${LIMIT_WORDS[answer.limited_by]}`;
  const old = stale ? ', from a stale estimate' : '';
  return `${hoursText(answer.hours.p90)} at ${power(answer.power_MW_el)} MW electric${limit}${old}`;
}
