import type { History } from '../adapters/history/history.js';
import { headOf } from '../adapters/http/planHead.js';
import type { Announcer } from '../adapters/mqtt/announcer.js';
import type { UnitDefinition } from '../core/definitions.js';
import type { DispatchAnswer } from '../core/estimate.js';
import { limitedAnswers } from '../core/plan/limitedBy.js';
import { shortTable } from '../core/plan/offerSummary.js';
import { HeadroomOnHours } from './headroomOnHours.js';
import { HoursOnChange } from './hoursOnChange.js';
import type { Notices } from './notices.js';
import type { KeptTable } from './plantService.js';
import type { Questions } from './questions.js';
import type { RunnerStep, UnitRunner } from './unitRunner.js';

export interface SpeakerOptions {
  readonly questions: Questions;
  readonly history: History;
  readonly notices: Notices;
  readonly runners: ReadonlyMap<string, UnitRunner>;
  announcer(): Announcer;
  backlog(): number;
  /** The offer table of a unit that was kept last; null where there is none. */
  newestKept(unit: string): KeptTable | null;
  /** What a unit tells has changed. */
  changed(unit: string): void;
}

/** What units have to say: estimates, hours, headroom and offers, as they come and after a start. */
export class Speaker {
  private readonly hoursOnChange: HoursOnChange;
  private readonly headroomOnHours: HeadroomOnHours;

  constructor(private readonly options: SpeakerOptions) {
    const { questions, history, notices, announcer, changed } = options;
    this.hoursOnChange = new HoursOnChange({
      ...{ questions, history, notices },
      answered: (runner, dispatch) => {
        this.sayHours(runner.unit, dispatch.time, dispatch.answers);
        changed(runner.unit.id);
      },
    });
    this.headroomOnHours = new HeadroomOnHours({
      ...{ questions, notices, now: () => performance.now() },
      answered: ({ unit, view }, { time, answers }) => {
        view.headroom = { time, answers };
        const head = headOf(unit, time, view.estimate?.quality ?? 'blind');
        announcer().headroom({ ...head, answers });
      },
    });
  }

  stop(): void {
    this.headroomOnHours.stop();
  }

  /** What was last said before this start is said again. */
  restate(): void {
    const announcer = this.options.announcer();
    for (const [id, { unit, view }] of this.options.runners) {
      if (view.estimate) announcer.state(view.estimate);
      if (view.watch) announcer.watch(view.watch);
      if (view.dispatch) this.sayHours(unit, view.dispatch.time, view.dispatch.answers);
      const table = this.options.newestKept(id);
      if (table) this.sayOffers(id, table);
    }
  }

  stepped(runner: UnitRunner, { step }: RunnerStep): void {
    const { estimate } = step;
    const { announcer, backlog, changed } = this.options;
    announcer().state(estimate);
    if (step.watch) announcer().watch(step.watch);
    this.hoursOnChange.stepped(runner, estimate, backlog());
    this.headroomOnHours.stepped(runner, estimate, backlog());
    if (estimate.dispatch) this.sayHours(runner.unit, estimate.time, estimate.dispatch);
    changed(runner.unit.id);
  }

  sayOffers(unit: string, { no, asked_ms, answer }: KeptTable): void {
    const asked = new Date(asked_ms).toISOString();
    this.options.announcer().offers({ ...shortTable(answer), unit, no, asked });
  }

  /** Hours with what limits them: the machine, the connection, an outage. */
  private sayHours(unit: UnitDefinition, time: string, answers: readonly DispatchAnswer[]): void {
    this.options.announcer().dispatch(unit.id, time, limitedAnswers(unit, time, answers));
  }
}
