import type { StoredCheckpoint } from '../../adapters/history/checkpoints.js';
import type { History } from '../../adapters/history/history.js';
import type { Journal } from '../../adapters/history/journal.js';
import type { LateReading } from '../../adapters/history/lateReadings.js';
import { isFuture } from '../../core/scan/assemble.js';
import type { UnitRunner } from '../unitRunner.js';
import { Gaps } from './gaps.js';

/** Late readings looked up at a time, and numbers of the journal looked through at a time. */
const PAGE = 500;
export const JOURNAL_PAGE = 5000;

export interface PlanParts {
  readonly journal: Journal;
  readonly history: History;
  /** A runner of the unit without a past. */
  fresh(): UnitRunner;
  /** A source time further ahead of its arrival than this is not believed [ms]. */
  readonly future_tolerance_ms: number;
}

export interface RewindPlan {
  /** The unit as it was before the oldest scan that is to be made again; null: nothing is to be done. */
  readonly start: { readonly runner: UnitRunner; readonly time_ms: number } | null;
  /** Of use: their scan has no value of their channel. */
  readonly used: number;
  /** Their scan has one, or a copy of them came before. */
  readonly repeated: number;
  /** From before the oldest state that can be gone back to. */
  readonly too_late: number;
  /** Off by the whole hours by which their channel was found to be off since. */
  readonly wrong_zone: number;
}

/**
 * Finds out which of the late readings that wait are of use, drops the others, and puts a runner back
 * to the state before the oldest of use. A generator, so that it can be done piece by piece.
 *
 * @param through_seq readings up to this number of the journal
 */
export function* planRewind(
  live: UnitRunner,
  through_seq: number,
  parts: PlanParts,
): Generator<void, RewindPlan> {
  const { history } = parts;
  const { unit } = live;
  const period_ms = unit.scan_period_s * 1000;
  let too_late = 0;
  const first = history.late.waiting(unit.id, through_seq);
  if (first === null) return { start: null, used: 0, repeated: 0, too_late, wrong_zone: 0 };
  let back = goBack(live, first.oldest_ms, parts);
  // From before all states that there are: the rest may yet be of use.
  const oldest = back === null ? history.rewindPoints.oldest(unit) : null;
  if (oldest !== null) back = goBack(live, Number.POSITIVE_INFINITY, parts, oldest);
  const reach_ms =
    back === null ? Number.POSITIVE_INFINITY : back.runner.untouchedFrom! * period_ms;

  const gaps = new Gaps(live.unit);
  for (let after = 0; ; ) {
    const page = history.late.waitingAfter(unit.id, after, through_seq, PAGE);
    if (page.length === 0) break;
    after = page.at(-1)!.seq;
    const old = page.filter(({ time_ms }) => time_ms < reach_ms);
    history.late.drop(unit.id, old);
    too_late += old.length;
    for (const { time_ms } of page) if (time_ms >= reach_ms) gaps.expect(time_ms);
    yield;
  }
  if (back === null) return { start: null, used: 0, repeated: 0, too_late, wrong_zone: 0 };
  const waiting = waitingIn(history, unit.id, through_seq);
  let head = waiting.next().value;
  const useless: LateReading[] = [];
  let used = 0;
  let wrong_zone = 0;
  let oldest_ms = Number.POSITIVE_INFINITY;
  for (let seq = back.runner.seq; seq < through_seq; ) {
    const { entries, seq: reached } = parts.journal.readUnit(
      ...[unit.id, seq, through_seq, JOURNAL_PAGE],
    );
    seq = reached;
    for (const entry of entries) {
      if (entry.kind === 'close') continue;
      const { time_ms } = entry;
      const channel = live.channelOf(entry.channel);
      const isWaiting = head?.seq === entry.seq;
      if (isWaiting) head = waiting.next().value;
      const isOfNoTime =
        isFuture(entry, parts.future_tolerance_ms) || live.clocks.wasPutAside(entry);
      if (channel === undefined || isOfNoTime) {
        if (isWaiting) useless.push({ time_ms, seq: entry.seq });
      } else if (isWaiting && live.isWrongZone(entry)) {
        useless.push({ time_ms, seq: entry.seq });
        wrong_zone++;
      } else if (!isWaiting) gaps.fill(channel, time_ms, entry.value);
      else if (!gaps.isOfUse(channel, time_ms, entry.value))
        useless.push({ time_ms, seq: entry.seq });
      else {
        used++;
        oldest_ms = Math.min(oldest_ms, time_ms);
      }
    }
    yield;
  }
  history.late.drop(unit.id, useless);
  const repeated = useless.length - wrong_zone;
  if (used === 0) return { start: null, used, repeated, too_late, wrong_zone };
  const start = goBack(live, oldest_ms, parts) ?? back;
  return { start, used, repeated, too_late, wrong_zone };
}

/**
 * A runner as the unit was before the scan of a time; null where there is no such state.
 * @param newest_ms no later state than of this time
 */
function goBack(
  live: UnitRunner,
  time_ms: number,
  { history, fresh }: PlanParts,
  newest_ms = time_ms,
) {
  const period_ms = live.unit.scan_period_s * 1000;
  const index = Math.floor(time_ms / period_ms);
  const end_ms = Math.min(index * period_ms, newest_ms + 1);
  for (const point of history.rewindPoints.before(live.unit, end_ms)) {
    const runner = fresh();
    if (!restored(runner, point)) continue;
    const untouched = runner.untouchedFrom;
    if (untouched !== null && untouched <= index) return { runner, time_ms: point.time_ms };
  }
  return null;
}

/** A damaged one is no state: an older one serves as well. */
function restored(runner: UnitRunner, point: StoredCheckpoint): boolean {
  try {
    runner.restore(point, 0);
    return true;
  } catch {
    return false;
  }
}

function* waitingIn(history: History, unit: string, through_seq: number): Generator<LateReading> {
  for (let after = 0; ; ) {
    const page = history.late.waitingAfter(unit, after, through_seq, PAGE);
    if (page.length === 0) return;
    yield* page;
    after = page.at(-1)!.seq;
  }
}
