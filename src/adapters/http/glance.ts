import type { AlarmEntry } from '../../core/alarm/entry.js';
import type { UnitDefinition } from '../../core/definitions.js';
import type { DispatchAnswer } from '../../core/estimate.js';
import { type LimitedAnswer, limitedAnswers } from '../../core/plan/limitedBy.js';
import type { UnitListView } from './schema/answers.js';
import type { UnitNow } from './service.js';

type Glance = UnitListView['units'][number];

const WATT_PER_MW = 1e6;

/**
 * A unit among several.
 *
 * @param shown alarms and alerts of the unit, and how many are held back
 */
export function glanceView(now: UnitNow, shown: readonly AlarmEntry[], held_back: number): Glance {
  const { unit, estimate } = now;
  const alarms = { high: 0, medium: 0, low: 0 };
  for (const entry of shown) if (entry.class === 'alarm') alarms[entry.priority]++;
  return {
    unit: unit.id,
    name: unit.name,
    mode: estimate?.mode ?? null,
    quality: estimate?.quality ?? null,
    state_of_charge: estimate?.state_of_charge ?? null,
    time: estimate?.time ?? null,
    age_s: now.age_s,
    stale: now.stale,
    flow_kg_s: now.flow_kg_s,
    power_MW_el: now.power_MW_el,
    dispatchable: dispatchableOf(now),
    headroom: headroomOf(now),
    alarms,
    alerts: shown.filter((entry) => entry.class === 'alert').length,
    unacknowledged: shown.filter(({ state }) => state.endsWith('unacknowledged')).length,
    held_back,
  };
}

type Figures = Pick<DispatchAnswer, 'power_MW' | 'hours' | 'energy_MWh_el'>;

function dispatchableOf({ unit, dispatch }: UnitNow): Glance['dispatchable'] {
  const answer = dispatch && atRated(unit, dispatch.answers);
  if (!dispatch || !answer) return null;
  // What cannot be told of one unit must not take the others along.
  const isTold = Number.isFinite(answer.hours.p10);
  const [limited] = isTold ? limitedAnswers(unit, dispatch.time, [answer]) : [];
  return firm(dispatch.time, answer, limited?.limited_by ?? null);
}

function headroomOf({ unit, headroom }: UnitNow): Glance['headroom'] {
  if (!headroom) return null;
  const answers = headroom.answers.map(({ power_MW_el, ...rest }) => ({
    ...rest,
    power_MW: power_MW_el,
  }));
  const answer = atRated(unit, answers);
  return answer ? firm(headroom.time, answer, answer.limited_by) : null;
}

/** That at rated power where it was asked, else the first. */
function atRated<A extends Figures>(unit: UnitDefinition, answers: readonly A[]): A | undefined {
  const rated_MW = unit.rated_power_W / WATT_PER_MW;
  return answers.find(({ power_MW }) => power_MW === rated_MW) ?? answers[0];
}

function firm(
  time: string,
  { power_MW, hours, energy_MWh_el }: Figures,
  limited_by: LimitedAnswer['limited_by'],
): Glance['dispatchable'] {
  return { time, power_MW, hours: hours.p90, energy_MWh_el: energy_MWh_el.p90, limited_by };
}
