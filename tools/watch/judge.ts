import type { CauseKind } from '../../src/core/watch/causes.js';
import { type Branch, lotOf } from './branches.js';
import { DEGRADATION, expectedOf, isOf } from './expected.js';
import type { Believed, Told, WatchRun } from './watchRun.js';

/** What became of one fault of one seed. */
export interface Judged {
  readonly seed: number;
  /** Found in time with the right cause first, another one or none; found too late; not at all. */
  readonly outcome: 'right' | 'wrong_cause' | 'no_cause' | 'late' | 'missed';
  /** From the onset to the first alert that tells of it [h]. */
  readonly delay_h: number | null;
  /** Cause held at that alert was the right one. */
  readonly rightAtOnce: boolean;
  /** Cause held at the end of the time that there was. */
  readonly cause: CauseKind | null;
  /** Degradation alerts that neither tell of it nor follow from it, by kind and subject. */
  readonly others: readonly string[];
}

/** Holds what was told of a branch against what should have been. */
export function judge(branch: Branch, seed: number, run: WatchRun): Judged {
  const expected = expectedOf(branch.id);
  const { store } = lotOf(seed, branch.id);
  const here = (subject: string): boolean => expected.unit === true || isOf(subject, store);
  const raised = run.events.filter((e) => e.transition === 'raised');
  const tells = (e: Told): boolean => expected.kinds.includes(e.kind) && here(e.subject);
  const follows = (e: Told): boolean =>
    expected.follows.includes(e.kind) && (here(e.subject) || !isOfStore(e.subject));
  const first = raised.find(tells);
  const others = raised
    .filter((e) => DEGRADATION.has(e.kind) && !tells(e) && !follows(e))
    .map((e) => `${e.kind} ${e.subject}`);
  const right = (believed: Believed['cause']): boolean =>
    believed !== null &&
    expected.causes.includes(believed.cause) &&
    (here(believed.subject) || !isOfStore(believed.subject));
  const inTime = first !== undefined && first.t_h <= branch.window_h + 1e-9;
  const last = believedAt(run.causes, branch.window_h);
  const outcome = (): Judged['outcome'] => {
    if (first === undefined) return 'missed';
    if (!inTime) return 'late';
    if (last === null) return 'no_cause';
    return right(last) ? 'right' : 'wrong_cause';
  };
  return {
    seed,
    outcome: outcome(),
    delay_h: first?.t_h ?? null,
    rightAtOnce: first !== undefined && right(believedAt(run.causes, first.t_h)),
    cause: last?.cause ?? null,
    others: [...new Set(others)],
  };
}

const isOfStore = (subject: string): boolean => isOf(subject, 'hot') || isOf(subject, 'cold');

/** What was held for the cause at a time [h]; null where nothing was. */
function believedAt(causes: readonly Believed[], t_h: number): Believed['cause'] {
  return causes.findLast((one) => one.t_h <= t_h + 1e-9)?.cause ?? null;
}

/** An alert of a healthy plant, and the stretch that it came in. */
export interface FalseAlert extends Told {
  readonly stretch: string;
  /** Of `stores_mismatched`: how far they were apart in truth, of the rated energy; null: not known. */
  readonly truly?: number | null;
}

/** What the healthy stretches of a plant brought. */
export interface HealthyJudged {
  readonly seed: number;
  readonly days: number;
  readonly alarms: number;
  readonly degradation: readonly FalseAlert[];
  /** Alerts of sensors, data and views. */
  readonly other: readonly FalseAlert[];
}

/**
 * @param runs of one plant by the name of their stretch
 * @param trulyOf how far its stores were apart in truth at a time of a stretch, of the rated energy
 */
export function judgeHealthy(
  seed: number,
  runs: ReadonlyMap<string, WatchRun>,
  trulyOf: (stretch: string, t_h: number) => number | null = () => null,
): HealthyJudged {
  const raised = [...runs].flatMap(([stretch, run]) =>
    run.events
      .filter((e) => e.transition === 'raised')
      .map((e): FalseAlert => {
        const known = e.kind === 'stores_mismatched' ? { truly: trulyOf(stretch, e.t_h) } : {};
        return { ...e, stretch, ...known };
      }),
  );
  return {
    seed,
    days: [...runs.values()].reduce((sum, run) => sum + run.hours / 24, 0),
    alarms: raised.filter((e) => e.class === 'alarm').length,
    degradation: raised.filter((e) => DEGRADATION.has(e.kind)),
    other: raised.filter((e) => e.class !== 'alarm' && !DEGRADATION.has(e.kind)),
  };
}
