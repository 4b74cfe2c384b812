/** Part of a course of power, linear in time; powers are sizes, at least 0 [W]. */
export interface RampStep {
  readonly to_s: number;
  readonly power_W: number;
  readonly purpose: 'run' | 'ramp';
}

/** Shorter than this a step is only rounding and is added to its neighbour [s]. */
export const SLIVER_S = 1e-6;

/**
 * Power of a run over a stretch of constant target: it nears the target at the greatest rate, holds
 * it, and falls at that rate so as to stay at or below `level - rate t`.
 *
 * @param from_s, power_W where it stands
 * @param target_W at least 0
 * @param to_s end of the stretch; Infinity only with an infinite level
 * @param rate_W_s greatest change of power; null = at once, the level is not looked at
 * @param level_W see `descentFrom`
 */
export function rampWithin(
  from_s: number,
  power_W: number,
  target_W: number,
  to_s: number,
  rate_W_s: number | null,
  level_W: number,
): RampStep[] {
  if (!(to_s > from_s)) return [];
  if (rate_W_s === null) return [{ to_s, power_W: target_W, purpose: 'run' }];
  const steps: RampStep[] = [];
  let t = from_s;
  let power = power_W;
  const add = (until_s: number, next_W: number, purpose: RampStep['purpose']): void => {
    if (!(until_s > t)) return;
    power = next_W;
    if (until_s - t > SLIVER_S) steps.push({ to_s: until_s, power_W: next_W, purpose });
    else {
      const last = steps.pop();
      // The next begins where this began, or there is none and it stays.
      if (last === undefined && until_s < to_s) return;
      steps.push({ to_s: until_s, power_W: next_W, purpose: last?.purpose ?? purpose });
    }
    t = until_s;
  };
  if (power !== target_W) {
    const reached_s = t + Math.abs(target_W - power) / rate_W_s;
    // Rising, it may meet the line down before the target.
    const meets_s =
      power < target_W
        ? Math.max(t, (level_W - power + rate_W_s * t) / (2 * rate_W_s))
        : Number.POSITIVE_INFINITY;
    if (reached_s <= Math.min(to_s, meets_s)) add(reached_s, target_W, 'ramp');
    else {
      const until_s = Math.min(to_s, meets_s);
      const change = Math.sign(target_W - power) * rate_W_s * (until_s - t);
      add(until_s, power + change, 'ramp');
    }
    // A ramp too short for the clock's last digit.
    if (reached_s <= t) power = target_W;
  }
  const falls_s = Math.min(to_s, Math.max(t, (level_W - power) / rate_W_s));
  add(falls_s, power, 'run');
  add(to_s, Math.max(0, power - rate_W_s * (to_s - t)), 'ramp');
  return steps;
}
