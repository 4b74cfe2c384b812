import type { Mode, UnitDefinition } from '../core/definitions.js';
import type { Estimate } from '../core/estimate.js';
import type { Headroom } from '../core/plan/headroom.js';
import { reasonOf } from '../errors.js';
import type { Notices } from './notices.js';
import type { Questions } from './questions.js';
import type { UnitRunner } from './unitRunner.js';

export interface HeadroomAnswer {
  /** Source time of the estimate that it stands on. */
  readonly time: string;
  readonly answers: readonly Headroom[];
}

export interface HeadroomOnHoursOptions {
  readonly questions: Pick<Questions, 'hasWorker' | 'plan'>;
  readonly notices: Pick<Notices, 'warn'>;
  /** Time of this process [ms]. */
  now(): number;
  answered(runner: UnitRunner, headroom: HeadroomAnswer): void;
}

/** Further behind the journal than this, the state is history already [entries]. */
const MOST_BEHIND = 1000;
/** Where plant time runs fast, the worker spends at most one part in so many on it. */
const REST = 9;

interface Turn {
  mode: Mode | null;
  due: boolean;
  asking: boolean;
  /** Not before this time of the process [ms]. */
  free_ms: number;
}

/**
 * What a unit can still take, asked of the worker whenever hours are computed: on the strokes of its
 * own clock and after a change of mode. Without a worker it is not asked: the thread takes scans in.
 */
export class HeadroomOnHours {
  private readonly turns = new Map<string, Turn>();
  private stopped = false;

  constructor(private readonly options: HeadroomOnHoursOptions) {}

  /** To be called with each new estimate; `backlog` in journal entries. */
  stepped(runner: UnitRunner, estimate: Estimate, backlog: number): void {
    const { unit } = runner;
    this.stopped = false;
    const turn = this.turns.get(unit.id) ?? { mode: null, due: false, asking: false, free_ms: 0 };
    this.turns.set(unit.id, turn);
    const changed = turn.mode !== null && turn.mode !== estimate.mode;
    turn.mode = estimate.mode;
    turn.due ||= changed || estimate.dispatch !== undefined;
    if (!this.options.questions.hasWorker || !turn.due || turn.asking) return;
    if (backlog > MOST_BEHIND || this.options.now() < turn.free_ms) return;
    const started = Object.values(estimate.stores).every((s) => s.fronts_reason !== 'not_started');
    if (!started) return;
    turn.due = false;
    this.ask(runner, estimate.time, turn).catch((thrown: unknown) => {
      if (this.stopped) return;
      this.options.notices.warn('questions', `headroom of unit ${unit.id}: ${reasonOf(thrown)}`);
    });
  }

  /** To be called before the questions end: what is on its way then is no trouble. */
  stop(): void {
    this.stopped = true;
  }

  private async ask(runner: UnitRunner, time: string, turn: Turn): Promise<void> {
    const { questions, answered, now } = this.options;
    const { unit } = runner;
    const begun_ms = now();
    turn.asking = true;
    try {
      const ask = { powers_W: chargingPowers(unit) };
      const answer = await questions.plan(unit, runner.snapshot(), { kind: 'headroom', ask });
      answered(runner, { time, answers: answer as readonly Headroom[] });
    } finally {
      const ended_ms = now();
      turn.asking = false;
      turn.free_ms = ended_ms + REST * (ended_ms - begun_ms);
    }
  }
}

/** Powers at which headroom is told [W]: the greatest charging power, and the rated where it charges. */
export function chargingPowers(unit: UnitDefinition): number[] {
  const { power_min_W, power_max_W } = unit.limits.charge;
  const most = Math.min(power_max_W, unit.limits.connection?.import_max_W ?? power_max_W);
  const rated = unit.rated_power_W;
  return rated >= power_min_W && rated < most ? [most, rated] : [most];
}
