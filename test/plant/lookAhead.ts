import type { MachineRoom } from './machineRoom.js';
import type { EndedBy, TrueHours } from './truthTypes.js';

/** Within 0.0005 h of the limit of small steps, by the test. */
const LOOK_AHEAD_STEP_S = 60;

/**
 * True hours at constant net power from now on: a copy is run until a stop rule ends it. The moment
 * at which an outlet or the flow passes its limit is found by a straight line between the middles of
 * the last two steps, for which both hold.
 * @param power_W net electrical power at the connection point, positive
 * @param step_s step of the look ahead
 */
export function trueHours(
  room: MachineRoom,
  power_W: number,
  step_s = LOOK_AHEAD_STEP_S,
  horizon_h = 100,
): TrueHours {
  if (!(power_W > 0)) throw new RangeError(`power_W must be positive, got ${power_W}`);
  const ahead = room.clone();
  const dt = step_s;
  const { geometry } = room;
  const limits = [
    ['hot_outlet', geometry.hot_outlet_min_K, -1],
    ['cold_outlet', geometry.cold_outlet_max_K, 1],
  ] as const;
  let seconds = 0;
  let before = ahead.outlets(false);
  let flowBefore = Number.NaN;
  while (seconds < horizon_h * 3600) {
    const { flow_kg_s, end } = ahead.stepAhead(power_W, dt);
    if (end !== null) {
      const beforeStep = end === 'flow' || end === 'empty';
      if (beforeStep && seconds === 0) return hoursOf(0, power_W, end);
      // Shares of the way from the middle of the last step to that of this one; the first rule counts.
      const now = beforeStep ? ahead.comingOutlets(false) : ahead.outlets(false);
      let first: EndedBy = end;
      let share = beforeStep ? passed(flowBefore, flow_kg_s, geometry.flow_max_kg_s) : 1;
      limits.forEach(([rule, limit, sign], j) => {
        if (limit === null || !ahead.swept || !(sign * (now[j]! - limit) > 0)) return;
        const own = passed(before[j]!, now[j]!, limit);
        if (own > share) return;
        share = own;
        first = rule;
      });
      return hoursOf(seconds + dt * (share - 0.5), power_W, first);
    }
    before = ahead.outlets(false);
    flowBefore = flow_kg_s;
    seconds += dt;
  }
  return hoursOf(seconds, power_W, 'empty');
}

/** Where between `from` and `to` a limit lies, 0..1; 1 where that cannot be told. */
function passed(from: number, to: number, limit: number): number {
  const share = (limit - from) / (to - from);
  return Number.isFinite(share) ? Math.min(Math.max(share, 0), 1) : 1;
}

function hoursOf(seconds: number, power_W: number, ends_by: EndedBy): TrueHours {
  const hours = Math.max(0, seconds) / 3600;
  return { hours, energy_MWh_el: (hours * power_W) / 1e6, ends_by };
}
