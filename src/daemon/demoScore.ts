import type { DispatchAnswer, Estimate } from '../core/estimate.js';
import type { DemoPlant } from '../plant/demoPlant.js';

/** How far one figure of the estimate was from the simulated truth. */
export interface Score {
  readonly what: string;
  readonly unit: string;
  readonly count: number;
  readonly rms: number;
  /** The greatest deviation with its sign, and when. */
  readonly worst: number;
  readonly worst_time: string;
}

interface Sum {
  unit: string;
  count: number;
  squares: number;
  worst: number;
  worst_time: string;
}

/** What is true at the end of a step, as far as it is scored. */
interface Truth {
  readonly soc: Readonly<Record<string, number>>;
  readonly hours: ReadonlyMap<number, number>;
}

/**
 * Estimates of one unit against the simulated truth of the same time: state of charge of each
 * store [% of its range] at every scan, and the hours [h] at each power where they were computed.
 */
export class DemoScore {
  private readonly truths = new Map<number, Truth>();
  private readonly sums = new Map<string, Sum>();
  private covered = 0;
  private answers = 0;

  /** @param hoursDue whether hours are computed at a time; the truth of hours costs as much again */
  constructor(
    private readonly plant: DemoPlant,
    private readonly powers_W: readonly number[],
    private readonly hoursDue: (time_ms: number) => boolean,
  ) {}

  /** Notes what is true now, to be called after each step of the plant. */
  note(): void {
    const { time_ms, stores } = this.plant.truth();
    const soc = Object.fromEntries(Object.entries(stores).map(([id, store]) => [id, store.soc]));
    const powers = this.hoursDue(time_ms) ? this.powers_W : [];
    const hours = new Map(powers.map((power) => [power / 1e6, this.plant.hoursTruth(power)]));
    this.truths.set(time_ms, { soc, hours });
  }

  /** Scores an estimate against what was noted for its time. */
  take(estimate: Estimate): void {
    const time_ms = Date.parse(estimate.time);
    const truth = this.truths.get(time_ms);
    this.truths.delete(time_ms);
    if (!truth) return;
    for (const [id, store] of Object.entries(estimate.stores)) {
      const error = 100 * (store.soc - truth.soc[id]!);
      this.add(`state of charge, ${id}`, '%', error, estimate.time);
    }
    for (const answer of estimate.dispatch ?? []) this.hours(answer, truth, estimate.time);
  }

  private hours(answer: DispatchAnswer, truth: Truth, time: string): void {
    const hours = truth.hours.get(answer.power_MW);
    if (hours === undefined) return;
    this.add(`hours at ${answer.power_MW} MW (p50)`, 'h', answer.hours.p50 - hours, time);
    this.answers++;
    if (hours >= answer.hours.p90) this.covered++;
  }

  /** Share of the answers whose firm figure (p90) was kept; about 0.9 where sigmas are right. */
  get firmShare(): number | null {
    return this.answers === 0 ? null : this.covered / this.answers;
  }

  get scores(): Score[] {
    return [...this.sums].map(([what, { squares, ...sum }]) => ({
      what,
      ...sum,
      rms: Math.sqrt(squares / sum.count),
    }));
  }

  private add(what: string, unit: string, error: number, time: string): void {
    const sum = this.sums.get(what) ?? { unit, count: 0, squares: 0, worst: 0, worst_time: time };
    this.sums.set(what, sum);
    sum.count++;
    sum.squares += error * error;
    if (Math.abs(error) < Math.abs(sum.worst)) return;
    sum.worst = error;
    sum.worst_time = time;
  }
}
