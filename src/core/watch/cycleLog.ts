import type { Mode } from '../definitions.js';
import type { CycleRules, CycleScan } from './cycle/cycleScan.js';
import { between, type Ends, endsOf } from './cycle/ends.js';
import { decided, weigh } from './cycle/evidence.js';
import { type CycleLogState, startCycleLog } from './cycle/logState.js';
import { addMoment, type RoundTrip, roundTrip, setEdge, startMoments } from './cycle/moments.js';
import { recordOf } from './cycle/record.js';
import {
  addRates,
  addScan,
  merge,
  noteRaised,
  type Rates,
  type Stretch,
  startStretch,
} from './cycle/stretch.js';
import type { CycleRecord } from './cycleRecord.js';
import type { IndicatorView } from './indicator.js';

export { type CycleLogState, cycleRules, startCycleLog } from './cycle/logState.js';

/** After so long without any reading nothing is known of what was: the log begins anew [ms]. */
const FORGET_MS = 24 * 3600 * 1000;

/**
 * One scan of the cycle log. Evidence is summed up as in a cumulative-sum test for a change: time in
 * another mode counts for it, time in the mode of the run twice against it,
 *
 *   S = max(0, S + dt),  S = max(0, S - 2 dt),
 *
 * and once S passes `pause_s` (standing) or `confirm_s` (running) the run ended where S left zero, the
 * usual estimate of a change point. Until then it is open whether what followed is a pause or a flicker:
 * it is summed up apart, and put into the run or into the next one, so that records follow each other
 * without gap or overlap and their energies add up to the whole. Part loads do not change the mode, and
 * scans that tell no mode are no evidence. The edge is half-way between the two scans about it.
 *
 * Electricity and heat are trapezoids between scans with readings, over empty ones too, `gap_s` at most;
 * power that alone is not read is held as long, then not counted. After a day without any reading the
 * log begins anew.
 *
 * @param state changed in place
 * @param indicators as they stand now
 * @returns the record of a run that is now known to be over
 * @throws RangeError for a scan not later than the last
 */
export function stepCycleLog(
  rules: CycleRules,
  state: CycleLogState,
  scan: CycleScan,
  indicators: readonly IndicatorView[],
): CycleRecord | null {
  const { time_ms } = scan;
  if (state.last !== null && !(time_ms > state.last.time_ms))
    throw new RangeError(`time_ms ${time_ms} is not later than the last, ${state.last.time_ms}`);
  const forgotten =
    state.seen !== null && time_ms - state.seen.time_ms > FORGET_MS
      ? forget(rules, state, indicators)
      : null;
  if (scan.stores.length === 0) return forgotten;
  const ends = endsOf(scan);
  if (state.open === null || state.last === null || state.rates === null) {
    begin(state, scan, ends);
    return forgotten;
  }
  const dt_s = (time_ms - state.last.time_ms) / 1000;
  const silent_s = (time_ms - (state.seen ?? state.last).time_ms) / 1000;
  if (!scan.read && silent_s <= rules.gap_s) {
    noteRaised(state.beside ?? state.open, scan.raised);
    return forgotten;
  }
  const now = ratesOf(rules, state, scan, dt_s);
  const before = state.beside ?? state.open;
  count(state, before, state.rates, dt_s / 7200);
  if (state.beside === null && scan.modeRead && scan.mode !== state.mode) {
    const edge = between(state.last, ends);
    state.open.end = edge;
    state.beside = startStretch(edge);
  }
  if (scan.modeRead) weigh(rules, state, scan.mode, dt_s);
  const own = state.beside ?? state.open;
  count(state, own, now, dt_s / 7200);
  addScan(own, scan, ends);
  const silent = noteSilence(rules, state, own, scan);
  Object.assign(state, { last: ends, rates: now });
  if (silent || state.power_age_s > rules.gap_s) restartMoments(state, ends);
  else addMoment(state.moments, ends, state.drawn_MWh, state.delivered_MWh, false);
  const next = decided(rules, state);
  return next === null ? forgotten : close(rules, state, next, indicators);
}

/** Adds half an interval to a stretch and to the sums over all time. */
function count(state: CycleLogState, stretch: Stretch, rates: Rates, hours: number): void {
  addRates(stretch, rates, hours);
  if (!Number.isFinite(rates.power_MW)) return;
  state.drawn_MWh += Math.max(0, rates.power_MW) * hours;
  state.delivered_MWh += Math.max(0, -rates.power_MW) * hours;
}

function begin(state: CycleLogState, scan: CycleScan, ends: Ends): void {
  const { mode, power_MW, flow_kg_s, flowKnown, ambient_K } = scan;
  const open = startStretch(ends);
  addScan(open, scan, ends);
  const carried_MW = scan.stores.map((store) => store.carried_MW);
  Object.assign(state, {
    ...{ mode, begunBefore: true, open, beside: null, against_s: 0, last: ends, seen: ends },
    rates: { mode, power_MW, flow_kg_s, flowKnown, ambient_K, carried_MW },
    ...{ power_age_s: 0, bed_ms: scan.time_ms },
  });
  Object.assign(state.running_s, { charge: 0, discharge: 0 });
  restartMoments(state, ends);
}

function restartMoments(state: CycleLogState, ends: Ends): void {
  Object.assign(state, { drawn_MWh: 0, delivered_MWh: 0, moments: startMoments() });
  addMoment(state.moments, ends, 0, 0, true);
}

function ratesOf(rules: CycleRules, state: CycleLogState, scan: CycleScan, dt_s: number): Rates {
  const { mode, flow_kg_s, flowKnown, ambient_K } = scan;
  const read = Number.isFinite(scan.power_MW);
  state.power_age_s = read ? 0 : state.power_age_s + dt_s;
  const held =
    state.power_age_s <= rules.gap_s ? (state.rates?.power_MW ?? Number.NaN) : Number.NaN;
  return {
    ...{ mode, flow_kg_s, flowKnown, ambient_K },
    power_MW: read ? scan.power_MW : held,
    carried_MW: scan.stores.map((store) => store.carried_MW),
  };
}

/** True where too long a time without readings ends with this scan, or goes on. */
function noteSilence(
  rules: CycleRules,
  state: CycleLogState,
  own: Stretch,
  scan: CycleScan,
): boolean {
  const { time_ms } = scan;
  const since = [state.seen?.time_ms ?? time_ms, state.bed_ms ?? time_ms];
  const silent = since.some((last_ms) => time_ms - last_ms > 1000 * rules.gap_s);
  own.gap ||= silent;
  if (scan.read) state.seen = own.end;
  if (scan.bedRead) state.bed_ms = time_ms;
  return silent;
}

function close(
  rules: CycleRules,
  state: CycleLogState,
  next: Mode,
  indicators: readonly IndicatorView[],
): CycleRecord | null {
  const { open, beside, moments } = state;
  if (open === null || beside === null) return null;
  if (state.begunBefore && (open.modes[state.mode]?.seconds ?? 0) < rules.confirm_s) {
    // The log began with a flicker: nothing was seen of a run.
    merge(open, beside);
    Object.assign(state, { mode: next, beside: null, against_s: 0 });
    Object.assign(state.running_s, { charge: 0, discharge: 0 });
    return null;
  }
  const drawn = state.drawn_MWh - beside.drawn_MWh;
  const delivered = state.delivered_MWh - beside.delivered_MWh;
  const whole = (moments.time_ms[0] ?? Number.POSITIVE_INFINITY) <= open.start.time_ms;
  // The moments may have begun anew since the run was over.
  const reaches = (moments.time_ms[0] ?? Number.POSITIVE_INFINITY) <= open.end.time_ms;
  if (reaches) setEdge(moments, open.end, drawn, delivered);
  const trip: RoundTrip | null =
    whole && state.mode === 'discharge' ? roundTrip(moments, open.start.time_ms) : null;
  if (reaches && state.last)
    addMoment(moments, state.last, state.drawn_MWh, state.delivered_MWh, true);
  const { mode, begunBefore } = state;
  const record = recordOf(rules, open, { no: ++state.no, mode, begunBefore, trip, indicators });
  Object.assign(state, {
    mode: next,
    begunBefore: false,
    open: beside,
    beside: null,
    against_s: 0,
  });
  Object.assign(state.running_s, { charge: 0, discharge: 0 });
  return record;
}

/** What was under way when the readings ended, until then; nothing is known of what came after. */
function forget(
  rules: CycleRules,
  state: CycleLogState,
  indicators: readonly IndicatorView[],
): CycleRecord | null {
  const { open, beside, seen, no } = state;
  const { mode, begunBefore } = state;
  Object.assign(state, startCycleLog(), { no });
  if (open === null || seen === null || seen.time_ms <= open.start.time_ms) return null;
  if (beside !== null) merge(open, beside);
  Object.assign(open, { end: seen, gap: true });
  state.no++;
  return recordOf(rules, open, { no: state.no, mode, begunBefore, trip: null, indicators });
}
