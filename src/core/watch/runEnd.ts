import type { Mode } from '../definitions.js';
import type { EndCause, Quality } from '../estimate.js';

/** A discharge has come to its power, and what the first readings under flow say is taken in, by then. */
const SETTLE_MS = 2 * 60_000;
/** Another power than the one told for, by so much for so long, was meant. */
const OTHER_POWER = 0.05;
const MEANT_MS = 5 * 60_000;
/** The end is computed anew so often, once it may be so near. */
const EVERY_MS = 5 * 60_000;
const LOOKED_AT_H = 1.5;

/** When a discharge ends at its power, as it was told. Source times [ms]. */
export interface ToldEnd {
  readonly made_ms: number;
  readonly power_W: number;
  /** p50 and p90: likeliest, and not before with 90 % probability. */
  readonly end_ms: number;
  readonly firm_ms: number;
}

/** The same by the newest estimate, likeliest. */
export interface ExpectedEnd {
  readonly made_ms: number;
  readonly power_W: number;
  readonly end_ms: number;
  readonly ends_by: EndCause;
}

/** Of the discharge that runs. Plain. */
export interface RunEndState {
  /** First scan of it. */
  readonly since_ms: number;
  told: ToldEnd | null;
  /** null while the end is far away. */
  expected: ExpectedEnd | null;
  /** Since when its power is another than the one told for. */
  other_ms: number | null;
}

export interface RunEndInput {
  readonly time_ms: number;
  readonly mode: Mode;
  readonly quality: Quality;
  /** Measured net power, either sign [W]; NaN = not known. */
  readonly power_W: number;
  /** Time left by the state of charge [h]: only to know when to look closer. */
  readonly roughly_h: number;
  /** An outlet is close to its limit. */
  readonly isNear: boolean;
  /** The operator has been warned of this end: the power that follows is his answer. */
  readonly isAlarmed: boolean;
}

/** Rollouts from the present estimate; see dispatch/hours. */
export interface Forecast {
  /** Hours at a power [W], with quantiles. */
  hours(power_W: number): { readonly p50: number; readonly p90: number };
  /** Likeliest hours alone, and what ends them. */
  central(power_W: number): { readonly hours: number; readonly ends_by: EndCause };
}

/** Whether hours by an estimate of this quality are worth telling. */
export function isGuide(quality: Quality): boolean {
  return quality === 'good' || quality === 'degraded';
}

/**
 * Keeps what was told of the end of a discharge, and what is expected of it now:
 *
 * told once the discharge has lasted two minutes, at its own power; where the power changes for good
 * both ends are moved by the ratio of what is left at either power, t + (end - t) tau(P') / tau(P), so
 * that a run that falls short of what was told still does. A power chosen after an alarm is told anew.
 * What is expected is computed every 5 min while the end is within an hour and a half or an outlet is
 * close to its limit; that is a rollout of as much. All in source time, so that a replay tells the same.
 *
 * @param state of the discharge so far, changed in place; undefined: none was running
 * @returns undefined where none is running now
 */
export function stepRunEnd(
  state: RunEndState | undefined,
  input: RunEndInput,
  forecast: Forecast,
): RunEndState | undefined {
  const { time_ms, mode, quality } = input;
  if (mode !== 'discharge') return undefined;
  const run = state ?? { since_ms: time_ms, told: null, expected: null, other_ms: null };
  const power_W = Math.abs(input.power_W);
  if (!isGuide(quality) || !(power_W > 0) || time_ms - run.since_ms < SETTLE_MS) return run;
  if (run.told === null) {
    run.told = tell(time_ms, power_W, forecast);
  } else if (Math.abs(power_W / run.told.power_W - 1) <= OTHER_POWER) {
    run.other_ms = null;
  } else {
    run.other_ms ??= time_ms;
    if (time_ms - run.other_ms >= MEANT_MS) {
      run.told = input.isAlarmed
        ? tell(time_ms, power_W, forecast)
        : moved(run.told, time_ms, power_W, forecast);
      run.other_ms = null;
      run.expected = null;
    }
  }
  const left_h = Math.min(input.roughly_h, (run.told.end_ms - time_ms) / 3.6e6);
  if (!input.isNear && left_h > LOOKED_AT_H) run.expected = null;
  else if (run.expected === null || time_ms - run.expected.made_ms >= EVERY_MS)
    run.expected = expect(time_ms, run.told.power_W, forecast);
  return run;
}

function tell(time_ms: number, power_W: number, forecast: Forecast): ToldEnd {
  const { p50, p90 } = forecast.hours(power_W);
  const at = (hours: number) => Math.round(time_ms + 3.6e6 * hours);
  return { made_ms: time_ms, power_W, end_ms: at(p50), firm_ms: at(p90) };
}

/** What was told for one power, for another one. */
function moved(told: ToldEnd, time_ms: number, power_W: number, forecast: Forecast): ToldEnd {
  const before = forecast.central(told.power_W).hours;
  const after = forecast.central(power_W).hours;
  if (!(before > 0 && after > 0 && told.end_ms > time_ms)) return tell(time_ms, power_W, forecast);
  const at = (end_ms: number) => Math.round(time_ms + ((end_ms - time_ms) * after) / before);
  return { ...told, power_W, end_ms: at(told.end_ms), firm_ms: at(told.firm_ms) };
}

function expect(time_ms: number, power_W: number, forecast: Forecast): ExpectedEnd {
  const { hours, ends_by } = forecast.central(power_W);
  return { made_ms: time_ms, power_W, end_ms: Math.round(time_ms + 3.6e6 * hours), ends_by };
}
