import type { Recording } from '../score/recording.js';

/** A run shorter than this ends no phase of a cycle, as for the indicator [s]. */
const LEAST_RUN_S = 1800;

/**
 * How far the stores of the plant truly stood apart at the end of its newest run, against the end of its
 * first one in that direction: in partial cycles nothing brings them together, so that a sound plant's
 * walk apart, and an alert of that is no error of the watch.
 *
 * @param t_h time in the recording [h]
 * @returns change of (hot less cold) state of charge [-], + = the hot store holds more; null where no
 *   second run of a direction has ended by then
 */
export function trulyApart(recording: Recording, t_h: number): number | null {
  const { scans, period_s } = recording.header;
  const first = new Map<number, number>();
  let newest: number | null = null;
  let mode = 0;
  let ran_s = 0;
  for (let n = 0; n < scans && ((n + 1) * period_s) / 3600 <= t_h + 1e-9; n++) {
    const now = Math.sign(recording.reading('mode', n));
    if (now !== mode) {
      if (mode !== 0 && ran_s >= LEAST_RUN_S) {
        const apart = recording.truth('hot.soc', n - 1) - recording.truth('cold.soc', n - 1);
        const from = first.get(mode);
        if (from === undefined) first.set(mode, apart);
        else newest = apart - from;
      }
      mode = now;
      ran_s = 0;
    }
    ran_s += period_s;
  }
  return newest;
}
