import type { Mode } from '../../definitions.js';
import type { CycleRules } from './cycleScan.js';
import { CONFIRM_SCANS, type CycleLogState } from './logState.js';
import { merge } from './stretch.js';

/** A scan of what the run does takes back so much of what spoke against it. */
const TAKEN_BACK = 2;

/** Counts a scan's mode for or against the run; one that speaks for it enough ends what lay beside. */
export function weigh(rules: CycleRules, state: CycleLogState, mode: Mode, dt_s: number): void {
  const span_s = Math.min(dt_s, rules.scan_s);
  // Never enough for a run by two scans, however far apart: one flicker may follow a hole, and one more.
  const running_s = Math.min(dt_s, rules.confirm_s / CONFIRM_SCANS);
  for (const way of ['charge', 'discharge'] as const) {
    const sum = state.running_s[way] + (mode === way ? running_s : -running_s);
    state.running_s[way] = way === state.mode ? 0 : Math.max(0, sum);
  }
  if (mode !== state.mode) {
    state.against_s += span_s;
    return;
  }
  state.against_s = Math.max(0, state.against_s - TAKEN_BACK * span_s);
  if (state.against_s > 0 || state.beside === null || state.open === null) return;
  merge(state.open, state.beside);
  state.beside = null;
}

/** What the unit does since the run was over; null while it goes on or nothing is decided. */
export function decided(rules: CycleRules, state: CycleLogState): Mode | null {
  if (state.beside === null) return null;
  for (const way of ['charge', 'discharge'] as const) {
    if (way !== state.mode && state.running_s[way] >= rules.confirm_s) return way;
  }
  return state.mode !== 'stand' && state.against_s >= rules.pause_s ? 'stand' : null;
}
