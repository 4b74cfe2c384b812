import { setImmediate } from 'node:timers/promises';
import type { SiteSource } from '../config/load.js';
import type { UnitDefinition } from '../core/definitions.js';
import type { DispatchAnswer } from '../core/estimate.js';
import type { PlanAnswer, PlanQuestion } from '../core/plan/ask.js';
import { takesLong } from '../core/plan/offerAsk.js';
import type { UnitSnapshot } from '../core/unit.js';
import type { UnitWorth } from '../core/worth/unitWorth.js';
import type { Core } from './core.js';
import { type MadeReport, type MadeReportAsk, makeReport } from './makeReport.js';
import { WorkerLine } from './workerLine.js';

/** In this thread a long answer is worked off in slices of so long [ms]. */
const SLICE_MS = 25;

/**
 * Questions that take long, answered by worker threads: one for hours, one for what thermocouples are
 * worth, so that seconds never wait for half a minute. Without a configuration file (a site made in
 * code) they are answered in this thread.
 */
export class Questions {
  private readonly quick: WorkerLine | null;
  private readonly slow: WorkerLine | null;
  /** Answers on their way, and those over a day for good: they follow from the configuration. */
  private readonly worths = new Map<string, Promise<UnitWorth | null>>();

  constructor(
    private readonly core: Core,
    source: SiteSource | null,
  ) {
    this.quick = source === null ? null : new WorkerLine(source);
    this.slow = source === null ? null : new WorkerLine(source);
  }

  /** false: questions are answered in this thread. */
  get hasWorker(): boolean {
    return this.quick !== null;
  }

  async hours(
    unit: UnitDefinition,
    snapshot: UnitSnapshot,
    powers_W: readonly number[],
  ): Promise<DispatchAnswer[]> {
    if (this.quick === null) {
      await setImmediate();
      return this.core.hoursAt(unit, this.core.restoreUnit(unit, snapshot), powers_W);
    }
    const question = { kind: 'hours', unit: unit.id, snapshot, powers_W } as const;
    return (await this.quick.ask(question)) as DispatchAnswer[];
  }

  /** What lies ahead of a state: offers, schedules, headroom and their like. */
  async plan(
    unit: UnitDefinition,
    snapshot: UnitSnapshot,
    question: PlanQuestion,
  ): Promise<PlanAnswer> {
    // Several marches of whole cycles, seconds each: hours do not wait for them.
    const long =
      question.kind === 'balance' || (question.kind === 'offers' && takesLong(question.ask));
    const line = long ? this.slow : this.quick;
    if (line === null) {
      await setImmediate();
      return this.core.answerPlan(unit, this.core.restoreUnit(unit, snapshot), question);
    }
    const asked = { kind: 'plan', unit: unit.id, snapshot, question } as const;
    return (await line.ask(asked)) as PlanAnswer;
  }

  /**
   * What thermocouples are worth over the hours ahead of a state, or over a settled day (null). Who
   * asks while the same is being answered gets that answer.
   * @returns null before every store has started
   */
  sensors(unit: UnitDefinition, snapshot: UnitSnapshot | null): Promise<UnitWorth | null> {
    const key = `${unit.id} ${snapshot === null ? 'day' : 'now'}`;
    const known = this.worths.get(key);
    if (known) return known;
    const answer = this.weigh(unit, snapshot);
    this.worths.set(key, answer);
    const forget = () => this.worths.delete(key);
    answer.then(snapshot === null ? () => undefined : forget, forget);
    return answer;
  }

  /** A maintenance report from the local store, which is read beside the daemon. */
  async report(unit: UnitDefinition, ask: MadeReportAsk): Promise<MadeReport> {
    if (this.slow === null) {
      await setImmediate();
      return makeReport(unit, ask);
    }
    return (await this.slow.ask({ kind: 'report', unit: unit.id, ask })) as MadeReport;
  }

  async stop(): Promise<void> {
    await Promise.all([this.quick?.stop(), this.slow?.stop()]);
  }

  private async weigh(
    unit: UnitDefinition,
    snapshot: UnitSnapshot | null,
  ): Promise<UnitWorth | null> {
    if (this.slow !== null) {
      return (await this.slow.ask({
        kind: 'sensors',
        unit: unit.id,
        snapshot,
      })) as UnitWorth | null;
    }
    const state = snapshot === null ? null : this.core.restoreUnit(unit, snapshot);
    const run = this.core.unitWorth(unit, state);
    let turned_ms = performance.now();
    for (let next = run.next(); ; next = run.next()) {
      if (next.done) return next.value;
      if (performance.now() - turned_ms < SLICE_MS) continue;
      await setImmediate();
      turned_ms = performance.now();
    }
  }
}
