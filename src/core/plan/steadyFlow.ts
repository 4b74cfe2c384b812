import { RULES } from '../dispatch/rollout.js';
import type { Command } from './command.js';
import type { Course } from './course.js';
import type { PlanResponse, RuleTime } from './spread.js';

const FLOW = RULES.indexOf('flow');
const OUTLETS = [RULES.indexOf('hot_outlet'), RULES.indexOf('cold_outlet')];

/**
 * Slopes of the rules' times with those of the greatest flow put right where a run's power steps: the
 * flow needed then passes its greatest at a step, and a small change moves that by a whole step or
 * not at all, so that a difference of two marches tells nothing. What moves the fronts moves all
 * rules alike: the slopes are then those of the outlet rule nearest in time, in proportion to the
 * time since the run's start.
 */
export function withSteadyFlow(
  response: PlanResponse,
  times: readonly RuleTime[],
  command: Command,
  course: Course,
): PlanResponse {
  const stand_ins = times.map((q, i) => {
    const { from_s } = course.episodes[q.episode] as Course['episodes'][number];
    const own = { from: i, factor: 1 };
    // A margin is smooth whatever the power does.
    if (q.rule !== FLOW || q.closest_s !== undefined) return own;
    if (!steps(command, course, q.episode)) return own;
    let best = own;
    let nearest = Number.POSITIVE_INFINITY;
    times.forEach((other, j) => {
      const apart = Math.abs(other.time_s - q.time_s);
      const lasts_s = other.time_s - from_s;
      if (other.episode !== q.episode || !OUTLETS.includes(other.rule)) return;
      if (!(apart < nearest && lasts_s > 0)) return;
      nearest = apart;
      best = { from: j, factor: Math.max(0, q.time_s - from_s) / lasts_s };
    });
    return best;
  });
  const put = (slopes: readonly number[]): number[] =>
    stand_ins.map(({ from, factor }) => (slopes[from] as number) * factor);
  return {
    stores: response.stores.map(({ bumps, flow, transfer }) => ({
      bumps: bumps.map(put),
      flow: put(flow),
      transfer: put(transfer),
    })),
    work: { discharge: put(response.work.discharge), charge: put(response.work.charge) },
    ambient: put(response.ambient),
  };
}

/** Whether a run is commanded more than one power, ramps aside. */
function steps(command: Command, course: Course, e: number): boolean {
  const { from_s, to_s } = course.episodes[e] as Course['episodes'][number];
  const powers = command.pieces
    .filter((piece) => piece.purpose === 'run' && piece.from_s >= from_s && piece.to_s <= to_s)
    .map((piece) => piece.power1_W);
  return powers.some((power) => power !== powers[0]);
}
