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
  let seconds = 0;
  let before = ahead.outlets(false);
  let flowBefore = Number.NaN;
  while (seconds < horizon_h * 3600) {
    const { flow_kg_s, end } = ahead.stepAhead(power_W, dt);
    if (end === 'empty' || end === 'flow') {
      const late = (flow_kg_s - geometry.flow_max_kg_s) / (flow_kg_s - flowBefore);
      return hoursOf(Number.isFinite(late) ? seconds + dt * (0.5 - late) : seconds, power_W, end);
    }
    const now = ahead.outlets(false);
    if (end !== null) {
      const [limit, was, is] =
        end === 'hot_outlet'
          ? [geometry.hot_outlet_min_K!, before[0], now[0]]
          : [geometry.cold_outlet_max_K!, before[1], now[1]];
      const share = is === was ? 1 : (limit - was) / (is - was);
      return hoursOf(seconds + dt * (Math.min(Math.max(share, 0), 1) - 0.5), power_W, end);
    }
    before = now;
    flowBefore = flow_kg_s;
    seconds += dt;
  }
  return hoursOf(seconds, power_W, 'empty');
}

function hoursOf(seconds: number, power_W: number, ends_by: EndedBy): TrueHours {
  const hours = Math.max(0, seconds) / 3600;
  return { hours, energy_MWh_el: (hours * power_W) / 1e6, ends_by };
}
