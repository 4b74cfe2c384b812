import type { UnitDefinition } from '../definitions.js';

/** What was last heard of each channel; owned by whoever holds it, changed only by `hold`. */
export interface HoldState {
  /** Last value heard, NaN where it was a bad one or nothing was heard yet. Index of unit.channels. */
  readonly value: Float64Array;
  /** When it was heard [ms since 1970]; NaN before the first. */
  readonly heard_ms: Float64Array;
}

/** Nothing heard yet. */
export function startHold(unit: Pick<UnitDefinition, 'channels'>): HoldState {
  return {
    value: new Float64Array(unit.channels.length).fill(Number.NaN),
    heard_ms: new Float64Array(unit.channels.length).fill(Number.NaN),
  };
}

/**
 * Carries the last value of silent channels that report by exception: silence of such a channel
 * means "no change beyond the deadband", for at most its longest silence. A channel that spoke,
 * even with a bad value, is never held over: it said that it has no value.
 *
 * @param unit   the unit; channels[i].reporting decides for values[i]
 * @param state  what was heard before; updated with this scan
 * @param time_ms source time of the scan [ms since 1970], not earlier than the one before
 * @param values readings of the scan, same order as unit.channels, in any unit; held values are
 *               written into it
 * @param heard  1 where the channel sent something in this scan, 0 where it was silent
 * @returns 1 where a value was carried on, 0 elsewhere
 * @throws RangeError where an array has another length than unit.channels
 */
export function hold(
  unit: Pick<UnitDefinition, 'channels'>,
  state: HoldState,
  time_ms: number,
  values: Float64Array,
  heard: Uint8Array,
): Uint8Array {
  const count = unit.channels.length;
  if (values.length !== count) {
    throw new RangeError(
      `values must have ${count} entries, one per channel, got ${values.length}`,
    );
  }
  if (heard.length !== count) {
    throw new RangeError(`heard must have ${count} entries, one per channel, got ${heard.length}`);
  }
  const held = new Uint8Array(count);
  for (let i = 0; i < count; i++) {
    if (heard[i] === 1) {
      state.value[i] = values[i] as number;
      state.heard_ms[i] = time_ms;
      continue;
    }
    const reporting = unit.channels[i]?.reporting;
    if (reporting?.kind !== 'by_exception') continue;
    const last = state.value[i] as number;
    // Comparisons with NaN are false: what was never heard is not held.
    if (time_ms - (state.heard_ms[i] as number) > reporting.longest_silence_s * 1000) continue;
    if (Number.isNaN(last)) continue;
    values[i] = last;
    held[i] = 1;
  }
  return held;
}
