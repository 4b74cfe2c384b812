import { parentPort, workerData } from 'node:worker_threads';
import { runnableSiteOf, type SiteSource } from './config/load.js';
import type { UnitDefinition } from './core/definitions.js';
import { answerPlan, type PlanAnswer, type PlanQuestion } from './core/plan/ask.js';
import { hoursAt, restoreUnit, type UnitSnapshot } from './core/unit.js';
import { type UnitWorth, unitWorth } from './core/worth/unitWorth.js';
import { type MadeReport, type MadeReportAsk, makeReport } from './daemon/makeReport.js';
import { reasonOf } from './errors.js';

/** A question to a worker: hours at some powers, what lies ahead, or what thermocouples are worth. */
export type WorkerQuestion =
  | {
      readonly kind: 'hours';
      readonly unit: string;
      readonly snapshot: UnitSnapshot;
      readonly powers_W: readonly number[];
    }
  | {
      readonly kind: 'plan';
      readonly unit: string;
      readonly snapshot: UnitSnapshot;
      readonly question: PlanQuestion;
    }
  | {
      readonly kind: 'sensors';
      readonly unit: string;
      /** For the hours ahead of this state; null = over a settled day. */
      readonly snapshot: UnitSnapshot | null;
    }
  | { readonly kind: 'report'; readonly unit: string; readonly ask: MadeReportAsk };

export interface NumberedQuestion {
  readonly id: number;
  readonly question: WorkerQuestion;
}

export type Answer = ReturnType<typeof hoursAt> | PlanAnswer | UnitWorth | MadeReport | null;

/** What was answered, or the words of what went wrong. */
export interface WorkerReply {
  readonly id: number;
  readonly answer?: Answer;
  readonly failure?: string;
  /** The failure's own code, where it has one. */
  readonly code?: string;
}

function answerTo(unit: UnitDefinition, question: WorkerQuestion): Answer {
  if (question.kind === 'hours') {
    return hoursAt(unit, restoreUnit(unit, question.snapshot), question.powers_W);
  }
  if (question.kind === 'plan') {
    return answerPlan(unit, restoreUnit(unit, question.snapshot), question.question);
  }
  if (question.kind === 'report') return makeReport(unit, question.ask);
  const { snapshot } = question;
  const run = unitWorth(unit, snapshot === null ? null : restoreUnit(unit, snapshot));
  let next = run.next();
  while (!next.done) next = run.next();
  return next.value;
}

/**
 * Answers questions that take long, beside the thread that takes scans in. Definitions hold
 * functions, which no message can carry: the worker makes them from the same text of the configuration,
 * whatever stands in the file by now.
 */
function serve(port: NonNullable<typeof parentPort>): void {
  const { units: configured } = runnableSiteOf(workerData as SiteSource);
  const units = new Map(configured.map((unit) => [unit.id, unit]));
  port.on('message', ({ id, question }: NumberedQuestion) => {
    let reply: WorkerReply;
    try {
      const unit = units.get(question.unit);
      if (!unit) {
        throw new RangeError(`unit must be one of the configuration, got ${question.unit}`);
      }
      reply = { id, answer: answerTo(unit, question) };
    } catch (thrown) {
      reply = { id, failure: reasonOf(thrown), ...codeOf(thrown) };
    }
    port.postMessage(reply);
  });
}

/** Of what lies at the ground of it: whether a file is damaged shows there. */
function codeOf(thrown: unknown): { code?: string } {
  const { code, cause } = (thrown ?? {}) as { code?: unknown; cause?: unknown };
  if (cause !== undefined && cause !== null) return codeOf(cause);
  return typeof code === 'string' ? { code } : {};
}

if (parentPort) serve(parentPort);
