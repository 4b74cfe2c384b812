import type { History } from '../adapters/history/history.js';
import type { Journal, JournalEntry, ReadingEntry } from '../adapters/history/journal.js';
import { isMachineDateless } from '../core/scan/assemble.js';
import { reasonOf } from '../errors.js';
import type { Log } from '../log.js';
import type { DaemonClock, SteadyClock } from './clock.js';
import { zoneWords } from './clockWords.js';
import type { Counters } from './counters.js';
import type { Entering } from './entering.js';
import type { Notices } from './notices.js';
import { restoreRunner } from './restore.js';
import type { UnitRunner } from './unitRunner.js';

/** Work in one go, after which messages and questions have their turn [ms]. */
const SLICE_MS = 25;
/** Journal entries read at a time. */
const PAGE = 512;
/** After a failure to read the journal [ms]. */
const RETRY_MS = 1000;

/** What a person is told of besides the count. */
const TOLD_FATES: readonly string[] = ['late', 'future', 'dateless', 'wrong_zone', 'unconfigured'];

export interface PipelineOptions {
  readonly journal: Journal;
  readonly history: History;
  readonly runners: readonly UnitRunner[];
  readonly clock: DaemonClock;
  readonly steady: SteadyClock;
  readonly counters: Counters;
  readonly notices: Notices;
  readonly log: Log;
  readonly entering: Entering;
  /** A reading came when its scan was closed. */
  late(runner: UnitRunner, reading: ReadingEntry, isNew: boolean): void;
}

/**
 * From journal to history: reads what was committed, in order, runs it through the units and
 * enters what comes out. It works in slices; how far it is behind the journal is its backlog.
 */
export class Pipeline {
  private seq = 0;
  private page: readonly JournalEntry[] = [];
  private onPage = 0;
  /** Units that may have closed scans to be worked off before the next entry. */
  private busy: UnitRunner[] = [];
  private scheduled: NodeJS.Immediate | null = null;
  private retry: NodeJS.Timeout | null = null;
  private running = false;
  private liveFrom = Number.POSITIVE_INFINITY;
  private idle: (() => void)[] = [];
  private readonly failing = new Map<string, string>();

  constructor(private readonly options: PipelineOptions) {}

  /** Restores every unit and replays the journal since. */
  start(): void {
    if (this.running) return;
    this.running = true;
    const { runners, journal } = this.options;
    this.liveFrom = journal.lastSeq + 1;
    for (const runner of runners) restoreRunner(runner, this.options);
    this.seq = Math.min(journal.lastSeq, ...runners.map((runner) => runner.seq));
    this.page = [];
    this.onPage = 0;
    // A stop may have come amid the scans of a long gap.
    this.busy = [...runners];
    this.kick();
  }

  /** Ends after the scan at hand and saves every unit. */
  stop(): void {
    if (!this.running) return;
    this.running = false;
    if (this.scheduled) clearImmediate(this.scheduled);
    this.scheduled = null;
    if (this.retry) clearTimeout(this.retry);
    this.retry = null;
    for (const runner of this.options.runners) this.options.entering.save(runner, true);
    for (const resolve of this.idle.splice(0)) resolve();
  }

  /** To be called when the journal has grown. */
  kick(): void {
    if (!this.running || this.scheduled) return;
    this.scheduled = setImmediate(() => this.slice());
  }

  /** Closes what is past its deadline, unless there are readings still to be considered. */
  closeDue(): void {
    if (!this.running || this.backlog > 0) return;
    const { journal, runners, steady, clock } = this.options;
    const steady_ms = steady.now();
    for (const runner of runners) {
      const index = runner.due(steady_ms);
      if (index === null) continue;
      try {
        journal.appendClose(runner.unit.id, index, Math.floor(clock.now()));
      } catch (thrown) {
        this.options.entering.storeFailed('journal_failures', thrown);
        return;
      }
    }
    this.kick();
  }

  /** Entries that are in the journal but not in the estimates. */
  get backlog(): number {
    return this.options.journal.lastSeq - this.seq + this.busy.length;
  }

  /** Whether a unit may have closed scans that are not worked off. */
  isBusy(runner: UnitRunner): boolean {
    return this.busy.includes(runner);
  }

  /** Why a unit's last scan could not be taken in, by unit. */
  get failures(): ReadonlyMap<string, string> {
    return this.failing;
  }

  /** Why the journal or the history could not be read or written the last time, null if they could. */
  get trouble(): string | null {
    return this.options.entering.trouble;
  }

  /** Resolves when everything in the journal is in the estimates. */
  caughtUp(): Promise<void> {
    if (this.backlog === 0) return Promise.resolve();
    return new Promise((resolve) => this.idle.push(resolve));
  }

  private slice(): void {
    this.scheduled = null;
    const end = performance.now() + SLICE_MS;
    const { entering } = this.options;
    while (this.running && performance.now() < end) {
      if (entering.isFull && !entering.retry()) {
        this.rest();
        return;
      }
      if (this.busy.length > 0) this.stepBusy();
      else if (!this.takeNext()) {
        this.rest();
        return;
      }
    }
    this.kick();
  }

  /** Nothing to do now, or, with a backlog, a journal that cannot be read. */
  private rest(): void {
    if (this.backlog > 0) this.retry ??= setTimeout(() => this.tryAgain(), RETRY_MS);
    else for (const resolve of this.idle.splice(0)) resolve();
  }

  private tryAgain(): void {
    this.retry = null;
    this.kick();
  }

  /** Takes the next entry in; false where there is none. */
  private takeNext(): boolean {
    if (this.onPage >= this.page.length) {
      this.page = this.readPage();
      this.onPage = 0;
    }
    const entry = this.page[this.onPage++];
    if (!entry) return false;
    const { runners, counters, notices, steady } = this.options;
    this.seq = entry.seq;
    const runner = runners.find(({ unit }) => unit.id === entry.unit);
    const isLive = entry.seq >= this.liveFrom;
    const isNobodys = entry.unit === '';
    const fate = runner ? runner.take(entry, steady.now()) : isNobodys ? null : 'unconfigured';
    if (fate !== null && isLive) {
      counters.add(fate);
      if (TOLD_FATES.includes(fate)) notices.warn(fate, describe(entry, fate));
      if (entry.kind === 'reading' && isMachineDateless(entry)) {
        counters.add('machine_dateless');
        const stands = new Date(entry.arrival_ms).toISOString();
        notices.warn('machine_dateless', `this machine's clock stands at ${stands}: set it`);
      }
    }
    if (runner && fate === 'late' && entry.kind === 'reading')
      this.options.late(runner, entry, isLive);
    if (runner) this.busy.push(runner);
    return true;
  }

  private readPage(): JournalEntry[] {
    try {
      return this.options.journal.read(this.seq, PAGE);
    } catch (thrown) {
      this.options.entering.storeFailed('journal_failures', thrown);
      return [];
    }
  }

  /** One scan of a unit that has closed ones, or the end of them. */
  private stepBusy(): void {
    const runner = this.busy.at(-1)!;
    const { counters, entering } = this.options;
    const skipped = runner.skippedScans;
    try {
      const step = runner.step();
      if (!step) {
        this.busy.pop();
        return;
      }
      counters.add('scans');
      counters.add(step.closed.cause === 'complete' ? 'scans_complete' : 'scans_deadline');
      if (step.closed.reported === 0) counters.add('scans_empty');
      counters.add('scans_skipped', runner.skippedScans - skipped);
      if (step.step.counts) counters.addScan(step.step.counts);
      this.failing.delete(runner.unit.id);
      entering.enter(runner, step);
    } catch (thrown) {
      this.failed(runner, thrown);
    }
  }

  private failed(runner: UnitRunner, thrown: unknown): void {
    const { counters, notices, history, entering } = this.options;
    counters.add('scan_failures');
    this.failing.set(runner.unit.id, reasonOf(thrown));
    notices.warn(
      `scan_failures ${runner.unit.id}`,
      `unit ${runner.unit.id}: a scan could not be taken in: ${reasonOf(thrown)}`,
    );
    const standing = entering.standingOf(runner.unit.id);
    try {
      runner.recover(history.checkpoints.list(runner.unit)[0], standing);
    } catch {
      runner.recover(undefined, standing);
    }
  }
}

function describe(entry: JournalEntry, fate: string): string {
  if (entry.kind === 'close') return `close mark of unit ${entry.unit}`;
  const time = new Date(entry.time_ms).toISOString();
  const behind_s = (entry.arrival_ms - entry.time_ms) / 1000;
  const why = {
    late: `came ${behind_s.toFixed(1)} s after its source time, when its scan was closed`,
    future: `is stamped ${(-behind_s).toFixed(1)} s ahead of this machine's clock`,
    dateless: 'is of a clock that has lost its date: not used',
    wrong_zone: `is ${zoneWords(-behind_s / 3600)}: not used`,
  }[fate];
  return `${entry.unit}, ${entry.channel}: the reading of ${time} ${why ?? 'has no such channel now'}`;
}
