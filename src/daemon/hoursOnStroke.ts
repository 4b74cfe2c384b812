import type { DispatchAnswer } from '../core/estimate.js';
import { reasonOf } from '../errors.js';
import type { Notices } from './notices.js';
import type { Questions } from './questions.js';
import type { RunnerStep, UnitRunner } from './unitRunner.js';

export interface HoursOnStrokeOptions {
  readonly questions: Pick<Questions, 'hasWorker' | 'hours'>;
  readonly notices: Pick<Notices, 'warn'>;
}

/** Scans that wait for their hours at a time; beyond, hours are computed at once. */
const MOST_HELD = 32;
/**
 * A scan waits at most so long for the worker, which may be busy with a question, and as long again for
 * each that waits before it [ms].
 */
const WAIT_MS = 1000;

interface Held {
  readonly step: RunnerStep;
  readonly timer: NodeJS.Timeout;
  /** What is to be done with the step, or with the failure of the core. */
  done(failure?: unknown): void;
}

/**
 * Hours where a unit's own clock strikes, computed by the worker: some hundred milliseconds in which
 * other units are not kept waiting. The unit's scan is told once they are there, and none of its
 * further ones is begun before, so that what comes out is the same as with hours computed at once.
 */
export class HoursOnStroke {
  private readonly held = new Map<UnitRunner, Held>();

  constructor(private readonly options: HoursOnStrokeOptions) {}

  /** Whether a scan may wait for its hours. */
  get mayHold(): boolean {
    return this.options.questions.hasWorker && this.held.size < MOST_HELD;
  }

  isHeld(runner: UnitRunner): boolean {
    return this.held.has(runner);
  }

  /** Holds a step whose hours are due until it has them. */
  hold(runner: UnitRunner, step: RunnerStep, done: (failure?: unknown) => void): void {
    const { questions, notices } = this.options;
    const { unit } = runner;
    const wait_ms = WAIT_MS * (this.held.size + 1);
    const timer = setTimeout(() => this.computeNow(runner), wait_ms);
    const own: Held = { step, timer, done };
    this.held.set(runner, own);
    questions.hours(unit, runner.snapshot(), unit.hours_at_W).then(
      (answers) => {
        if (this.held.get(runner) === own) this.finish(runner, () => answers);
      },
      (thrown: unknown) => {
        if (this.held.get(runner) !== own) return;
        notices.warn('questions', `hours of unit ${unit.id}: ${reasonOf(thrown)}`);
        this.computeNow(runner);
      },
    );
  }

  /** Computes what is still awaited at once: before the states are saved. */
  flush(): void {
    for (const runner of [...this.held.keys()]) this.computeNow(runner);
  }

  private computeNow(runner: UnitRunner): void {
    this.finish(runner, () => runner.hoursNow());
  }

  private finish(runner: UnitRunner, compute: () => DispatchAnswer[]): void {
    const own = this.held.get(runner);
    if (!own) return;
    this.held.delete(runner);
    clearTimeout(own.timer);
    try {
      runner.giveHours(own.step, compute());
    } catch (thrown) {
      own.done(thrown);
      return;
    }
    own.done();
  }
}
