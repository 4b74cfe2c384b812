import { type Signal, signal } from '@preact/signals';
import { AnswerError, type AnswerFault, wordsOf } from '../lib/api.js';
import { model } from '../lib/page.js';

/** What the unit was doing when a question was put: an answer is of that time. */
export interface Then {
  readonly mode: string | null;
  readonly state_of_charge: number | null;
}

export interface Asked<T> {
  /** Unit that it is of; of another unit it is not shown. */
  readonly unit: string | null;
  readonly answer: T | null;
  readonly was: Then;
  readonly fault: string | null;
  readonly faults: readonly AnswerFault[];
  /** Since when an answer is awaited [ms of performance.now()]; null: none is. */
  readonly since_ms: number | null;
}

const NOTHING: Asked<never> = {
  unit: null,
  answer: null,
  was: { mode: null, state_of_charge: null },
  fault: null,
  faults: [],
  since_ms: null,
};

/**
 * One kind of question that takes seconds. What was answered stays while other parts of the sheet
 * are looked at; a new question ends the one before, and nothing is ever asked by itself.
 */
export class Asking<T> {
  readonly state: Signal<Asked<T>> = signal<Asked<T>>(NOTHING);
  private ended: AbortController | null = null;

  /** What is known for this unit. */
  of(unit: string): Asked<T> {
    const state = this.state.value;
    return state.unit === unit ? state : NOTHING;
  }

  async ask(unit: string, question: (ended: AbortSignal) => Promise<T>): Promise<void> {
    this.ended?.abort();
    const ended = new AbortController();
    this.ended = ended;
    const before = this.of(unit);
    const asked = { ...before, unit, fault: null, faults: [], since_ms: performance.now() };
    this.state.value = asked;
    const estimate = model.unit.value?.state?.estimate;
    const was = {
      mode: estimate?.mode ?? null,
      state_of_charge: estimate?.state_of_charge ?? null,
    };
    try {
      const answer = await question(ended.signal);
      if (this.ended !== ended) return;
      this.state.value = { unit, answer, was, fault: null, faults: [], since_ms: null };
    } catch (thrown) {
      if (this.ended !== ended) return;
      const faults = thrown instanceof AnswerError ? thrown.faults : [];
      this.state.value = { ...asked, fault: wordsOf(thrown), faults, since_ms: null };
    }
  }

  /** Gives up what is awaited; the answer of before stays. */
  cancel(): void {
    this.ended?.abort();
    this.ended = null;
    this.state.value = { ...this.state.value, since_ms: null };
  }
}
