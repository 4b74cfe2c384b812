import type { History } from '../adapters/history/history.js';
import type { Mode } from '../core/definitions.js';
import type { DispatchAnswer, Estimate } from '../core/estimate.js';
import { reasonOf } from '../errors.js';
import type { Notices } from './notices.js';
import type { Questions } from './questions.js';
import type { UnitRunner } from './unitRunner.js';

export interface HoursOnChangeOptions {
  readonly questions: Questions;
  readonly history: History;
  readonly notices: Notices;
  answered(runner: UnitRunner, dispatch: { time: string; answers: DispatchAnswer[] }): void;
}

/** Further behind the journal than this, a change of mode is history already [entries]. */
const MOST_BEHIND = 1000;

/** Units that are asked for at a time: the worker answers one after the other. */
const MOST_ASKED = 4;

/**
 * Hours after a change of mode, between the strokes of the unit's own clock, and the first ones of a
 * unit whose clock strikes later: asked of the worker, so that they are there a moment after the scan.
 * The estimates themselves are not touched.
 */
export class HoursOnChange {
  private readonly modes = new Map<string, Mode>();
  /** Units whose hours are to be asked, and those that are. */
  private readonly wanted = new Set<string>();
  private readonly asked = new Set<string>();

  constructor(private readonly options: HoursOnChangeOptions) {}

  /** To be called with each new estimate; `backlog` in journal entries. */
  stepped(runner: UnitRunner, estimate: Estimate, backlog: number): void {
    const { unit, view } = runner;
    const before = this.modes.get(unit.id);
    this.modes.set(unit.id, estimate.mode);
    const changed = before === undefined ? view.dispatch === null : before !== estimate.mode;
    if (estimate.dispatch || unit.hours_at_W.length === 0) this.wanted.delete(unit.id);
    else if (changed) this.wanted.add(unit.id);
    if (!this.wanted.has(unit.id) || this.asked.has(unit.id)) return;
    if (backlog > MOST_BEHIND || this.asked.size >= MOST_ASKED) return;
    this.wanted.delete(unit.id);
    this.asked.add(unit.id);
    this.ask(runner, estimate.time)
      .catch((thrown: unknown) =>
        this.options.notices.warn('questions', `hours of unit ${unit.id}: ${reasonOf(thrown)}`),
      )
      .finally(() => this.asked.delete(unit.id));
  }

  private async ask(runner: UnitRunner, time: string): Promise<void> {
    const { questions, history, answered } = this.options;
    const { unit, view } = runner;
    const answers = await questions.hours(unit, runner.snapshot(), unit.hours_at_W);
    // The unit's own clock may have struck meanwhile: its answer is the newer one.
    if (view.dispatch && view.dispatch.time >= time) return;
    view.dispatch = { time, answers };
    history.write(() => history.estimates.addDispatch(unit.id, Date.parse(time), answers));
    answered(runner, { time, answers });
  }
}
