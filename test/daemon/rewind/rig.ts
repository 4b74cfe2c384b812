import { join } from 'node:path';
import { afterEach } from 'vitest';
import { History } from '../../../src/adapters/history/history.js';
import { Journal, type JournalReading } from '../../../src/adapters/history/journal.js';
import type { SetAside } from '../../../src/adapters/history/setAside.js';
import type { UnitDefinition } from '../../../src/core/definitions.js';
import type { Estimate } from '../../../src/core/estimate.js';
import type { WatchEvent } from '../../../src/core/watch/event.js';
import type { SteadyClock } from '../../../src/daemon/clock.js';
import type { Core } from '../../../src/daemon/core.js';
import { Counters } from '../../../src/daemon/counters.js';
import { Entering } from '../../../src/daemon/entering.js';
import { HoursOnStroke, type HoursOnStrokeOptions } from '../../../src/daemon/hoursOnStroke.js';
import { runnerMaker } from '../../../src/daemon/makeRunners.js';
import { Notices } from '../../../src/daemon/notices.js';
import { Pipeline } from '../../../src/daemon/pipeline.js';
import { toldBy } from '../../../src/daemon/rewind/remake.js';
import { Rewinder } from '../../../src/daemon/rewind/rewinder.js';
import { rewindRules } from '../../../src/daemon/rewind/rules.js';
import type { UnitRunner } from '../../../src/daemon/unitRunner.js';
import { createLog } from '../../../src/log.js';
import { temporaryFolder } from '../../support/folders.js';
import { waitFor } from '../../support/wait.js';
import { fakeCore } from '../fakeCore.js';
import { smallSite, smallUnit } from '../site.js';

export interface RigOptions {
  readonly folder?: string;
  readonly core?: Core;
  readonly units?: readonly UnitDefinition[];
  readonly late?: Partial<NonNullable<ReturnType<typeof smallSite>['late']>>;
  readonly checkpoint_every_s?: number;
  /** Where the machine's clock stands at the start [ms]. */
  readonly now_ms?: number;
  /** Who answers hours where a unit's clock strikes; without, they are computed at once. */
  readonly questions?: HoursOnStrokeOptions['questions'];
}

const NOBODY: HoursOnStrokeOptions['questions'] = {
  hasWorker: false,
  hours: () => Promise.reject(new Error('there is no worker')),
};

const LATE = { rewind_h: 48, rewind_point_every_s: 900, quiet_s: 30, wait_most_s: 600 };

/** Journal, pipeline, history and rewinder of a daemon without broker and page, with clocks by hand. */
export class Rig {
  readonly folder: string;
  readonly journal: Journal;
  readonly history: History;
  readonly counters = new Counters();
  readonly pipeline: Pipeline;
  readonly rewinder: Rewinder;
  readonly runners: ReadonlyMap<string, UnitRunner>;
  readonly told: WatchEvent[] = [];
  readonly setAside: SetAside[] = [];
  readonly stepped: Estimate[] = [];
  readonly lines: string[] = [];
  /** The machine's clock, and that of the deadlines [ms]. */
  now_ms = 0;
  steady_ms = 0;

  constructor(options: RigOptions = {}) {
    this.folder = options.folder ?? temporaryFolder('rewind');
    this.now_ms = options.now_ms ?? 0;
    const core = options.core ?? fakeCore;
    const units = options.units ?? [smallUnit()];
    const late = { ...LATE, ...options.late };
    const site = smallSite(null, { units, folder: this.folder, late });
    const make = runnerMaker(site, core);
    this.runners = new Map(units.map((unit) => [unit.id, make(unit)]));
    this.journal = new Journal(join(this.folder, 'journal.sqlite'));
    this.history = new History(
      join(this.folder, 'history.sqlite'),
      site.store,
      undefined,
      (what) => {
        this.setAside.push(what);
        this.rewinder.historyLost();
      },
      () => toldBy(this.runners.values()),
    );
    const destination = { write: (line: string) => void this.lines.push(JSON.parse(line).msg) };
    const log = createLog({ pretty: false, destination });
    const { journal, history, counters } = this;
    const clock = { now: () => this.now_ms, speed: 1 };
    const steady = { now: () => this.steady_ms } as SteadyClock;
    const common = { journal, history, counters, clock, steady, log, notices: new Notices(log) };
    const tells = {
      stepped: (_: UnitRunner, { step }: { step: { estimate: Estimate } }) =>
        void this.stepped.push(step.estimate),
      event: (event: WatchEvent) => void this.told.push(event),
      alarmsMoved: () => undefined,
    };
    const rules = rewindRules(site);
    const checkpoint_every_ms = (options.checkpoint_every_s ?? 600) * 1000;
    const entering = new Entering({
      ...common,
      ...rules,
      ...tells,
      checkpoint_every_ms,
      phase: () => 0,
    });
    const runners = [...this.runners.values()];
    this.pipeline = new Pipeline({
      ...{ ...common, runners, entering },
      hours: new HoursOnStroke({
        questions: options.questions ?? NOBODY,
        notices: common.notices,
      }),
      late: (runner, reading, isNew) => this.rewinder.note(runner, reading, isNew),
    });
    this.rewinder = new Rewinder({
      ...{ ...common, ...tells, runners, entering, rules, fresh: make, retry_ms: 20 },
      backlog: () => this.pipeline.backlog,
      isBusy: (runner) => this.pipeline.isBusy(runner),
    });
  }

  async start(): Promise<this> {
    this.journal.start();
    this.history.start();
    this.pipeline.start();
    await this.pipeline.caughtUp();
    this.rewinder.start();
    return this;
  }

  /** @param kill nothing is saved, as where the process is killed */
  stop(kill = false): void {
    this.rewinder.stop();
    if (!kill) this.pipeline.stop();
    this.history.stop();
    this.journal.stop();
  }

  async take(readings: readonly JournalReading[]): Promise<void> {
    this.journal.append(readings);
    for (const { arrival_ms } of readings) this.now_ms = Math.max(this.now_ms, arrival_ms);
    this.pipeline.kick();
    await this.pipeline.caughtUp();
  }

  /** Closes what is past its deadline when so much time has gone by without a reading. */
  async pass(ms: number): Promise<void> {
    this.steady_ms += ms;
    this.now_ms += ms;
    this.pipeline.closeDue();
    await this.pipeline.caughtUp();
  }

  /** Late readings have settled: they are taken in. */
  async settle(unit = 'u', limit_ms = 10_000): Promise<void> {
    this.steady_ms += 31_000;
    this.rewinder.poll();
    await waitFor('the rewind', () => this.rewinder.busyWith === null, limit_ms);
    if (this.rewinder.isAwaited(unit)) await this.settle(unit, limit_ms);
  }

  get runner(): UnitRunner {
    return [...this.runners.values()][0]!;
  }

  estimates(unit = 'u'): Estimate[] {
    return this.history.estimates.between(unit, 0, 8.64e15, 1e6);
  }
}

/** A reading of the small unit. */
export function reading(
  channel: string,
  time_ms: number,
  value: number,
  arrival_ms = time_ms,
  unit = 'u',
): JournalReading {
  return { unit, channel, time_ms, arrival_ms, value, quality: 'good' };
}

/** Starts rigs that are stopped after each test; to be called once in a file. */
export function rigsOfTests(): { rigs: Rig[]; started(options?: RigOptions): Promise<Rig> } {
  const rigs: Rig[] = [];
  afterEach(() => {
    for (const rig of rigs.splice(0)) rig.stop();
  });
  const started = (options: RigOptions = {}): Promise<Rig> => {
    const rig = new Rig(options);
    rigs.push(rig);
    return rig.start();
  };
  return { rigs, started };
}
