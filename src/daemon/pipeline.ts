import type { History } from '../adapters/history/history.js';
import type { Journal, JournalEntry, ReadingEntry } from '../adapters/history/journal.js';
import { isMachineDateless, type ReadingFate } from '../core/scan/assemble.js';
import { reasonOf } from '../errors.js';
import type { Log } from '../log.js';
import type { DaemonClock, SteadyClock } from './clock.js';
import { LEAST_LEAD_MS, returnWords } from './clockStretch.js';
import { zoneWords } from './clockWords.js';
import type { Counters } from './counters.js';
import type { Entering } from './entering.js';
import { Feed, type UnitLine } from './feed.js';
import type { HoursOnStroke } from './hoursOnStroke.js';
import type { Notices } from './notices.js';
import { restoreRunner } from './restore.js';
import type { RunnerStep, UnitRunner } from './unitRunner.js';

/** Work in one go, after which messages and questions have their turn: at least, one scan, at most [ms]. */
const SHORTEST_MS = 2;
const LONGEST_MS = 25;
/**
 * Of the time that the others took since: while many messages wait at the socket they come first, since
 * a reading is safe once it is in the journal and its scan can be made later. Least where all units that
 * have something to do are far behind anyway.
 */
const SHARE = { inStep: 1 / 3, behind: 1 / 12 };
/** Entries of one unit taken in before others have their turn, where they close no scan. */
const TURN_ENTRIES = 64;
/** After a failure to read the journal [ms]. */
const RETRY_MS = 1000;

/** What a person is told of besides the count. */
const TOLD_FATES: readonly string[] = [
  ...['late', 'future', 'dateless', 'wrong_zone', 'clock_back', 'unconfigured'],
];

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
  readonly hours: HoursOnStroke;
  /** A reading came when its scan was closed. */
  late(runner: UnitRunner, reading: ReadingEntry, isNew: boolean): void;
}

/**
 * From journal to history: reads what was committed, runs it through the units, each its own in their
 * order and one scan at a time in turn, and enters what comes out. It works in slices; how far it is
 * behind the journal is its backlog.
 */
export class Pipeline {
  private feed: Feed | null = null;
  /** Whose turn it is. */
  private turn = 0;
  private scheduled: NodeJS.Immediate | null = null;
  private retry: NodeJS.Timeout | null = null;
  private running = false;
  private sliceEnded_ms = 0;
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
    // A stop may have come amid the scans of a long gap: every unit may step before it takes.
    this.feed = new Feed(
      runners,
      Math.min(journal.lastSeq, ...runners.map((runner) => runner.seq)),
      (seq, most) => this.read(seq, most),
      (entry) => this.tell(entry, 'unconfigured'),
    );
    this.turn = 0;
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
    // A state that is saved holds no scan that was not told.
    this.options.hours.flush();
    for (const runner of this.options.runners) this.options.entering.save(runner, true);
    for (const resolve of this.idle.splice(0)) resolve();
  }

  /** To be called when the journal has grown. */
  kick(): void {
    if (!this.running || this.scheduled) return;
    this.scheduled = setImmediate(() => this.slice());
  }

  /** Closes what is past its deadline, unless there are readings of the unit still to be considered. */
  closeDue(): void {
    const { feed } = this;
    const { journal, steady, clock } = this.options;
    if (!this.running || !feed || feed.seq < journal.lastSeq) return;
    const steady_ms = steady.now();
    const arrival_ms = Math.floor(clock.now());
    const due = feed.lines.flatMap((line) => {
      if (line.mayStep || line.length > 0 || line.passed > 0) return [];
      const index = line.runner.due(steady_ms);
      return index === null ? [] : [{ unit: line.runner.unit.id, scan_index: index }];
    });
    try {
      journal.appendCloses(due, arrival_ms);
    } catch (thrown) {
      this.options.entering.storeFailed('journal_failures', thrown);
      return;
    }
    this.kick();
  }

  /** Entries that are in the journal but not in the estimates. */
  get backlog(): number {
    const { feed } = this;
    if (!feed) return 0;
    const busy = feed.lines.filter(({ mayStep }) => mayStep).length;
    return this.options.journal.lastSeq - feed.seq + feed.waiting + busy;
  }

  /** Whether a unit may have closed scans that are not worked off. */
  isBusy(runner: UnitRunner): boolean {
    return this.feed?.lines.find((line) => line.runner === runner)?.mayStep ?? false;
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
    const { feed } = this;
    if (!feed) return;
    const now_ms = performance.now();
    const share = feed.isAnyInStep ? SHARE.inStep : SHARE.behind;
    const share_ms = share * (now_ms - this.sliceEnded_ms);
    const isMore = this.work(feed, now_ms + Math.min(Math.max(share_ms, SHORTEST_MS), LONGEST_MS));
    this.sliceEnded_ms = performance.now();
    if (isMore) this.kick();
    else this.rest();
  }

  /** Works until then; false where there is nothing left that could be done. */
  private work(feed: Feed, end_ms: number): boolean {
    const { entering, journal } = this.options;
    while (this.running && performance.now() < end_ms) {
      if (entering.isFull && !entering.retry()) return false;
      const hasRead = feed.fill(journal.lastSeq);
      if (!this.round(feed, end_ms) && !hasRead) return false;
    }
    return true;
  }

  /** A turn for each unit, as far as time allows; false where none had anything to do. */
  private round(feed: Feed, end: number): boolean {
    const { lines } = feed;
    let worked = false;
    for (let n = 0; n < lines.length && this.running; n++) {
      const line = lines[this.turn % lines.length]!;
      this.turn = (this.turn + 1) % lines.length;
      if (!line.mayStep && line.length === 0) continue;
      if (this.options.hours.isHeld(line.runner)) continue;
      worked = true;
      this.turnOf(feed, line);
      if (performance.now() >= end) return true;
    }
    return worked;
  }

  /** One scan of a unit, or so many entries up to the next that closes one. */
  private turnOf(feed: Feed, line: UnitLine): void {
    for (let n = 0; n < TURN_ENTRIES; n++) {
      if (line.mayStep && this.step(line)) return;
      const entry = feed.take(line);
      if (!entry) return;
      this.takeIn(line, entry);
    }
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

  private takeIn(line: UnitLine, entry: JournalEntry): void {
    const { runner } = line;
    const fate = runner.take(entry, this.options.steady.now());
    line.mayStep = true;
    if (fate === null) return;
    const isLive = this.tell(entry, fate);
    if (fate === 'clock_back') this.goneBack(runner, isLive);
    if (fate === 'late' && entry.kind === 'reading') this.options.late(runner, entry, isLive);
  }

  /** Says where a unit has gone back to before clocks were ahead; what a replay repeats was said. */
  private goneBack(runner: UnitRunner, isNew: boolean): void {
    const back = runner.takeWentBack();
    if (back === null) return;
    const { counters, log, entering } = this.options;
    entering.wentBack(runner, back.stretch);
    if (!isNew) return;
    const { id } = runner.unit;
    counters.add('clock_returns');
    log.warn({ unit: id, ...back.stretch }, `unit ${id}: ${returnWords(back.stretch)}`);
  }

  /** Counts what became of an entry, where it is not of a replay; whether it is not. */
  private tell(entry: JournalEntry, fate: ReadingFate | 'unconfigured'): boolean {
    const { counters, notices } = this.options;
    if (entry.seq < this.liveFrom) return false;
    counters.add(fate);
    if (TOLD_FATES.includes(fate)) notices.warn(fate, describe(entry, fate));
    if (entry.kind === 'reading' && isMachineDateless(entry)) {
      counters.add('machine_dateless');
      const stands = new Date(entry.arrival_ms).toISOString();
      notices.warn('machine_dateless', `this machine's clock stands at ${stands}: set it`);
    }
    return true;
  }

  private read(seq: number, most: number): JournalEntry[] {
    try {
      return this.options.journal.read(seq, most);
    } catch (thrown) {
      this.options.entering.storeFailed('journal_failures', thrown);
      return [];
    }
  }

  /** One scan of a unit that may have closed ones; false where it has none. */
  private step(line: UnitLine): boolean {
    const { runner } = line;
    const { counters, hours } = this.options;
    const skipped = runner.skippedScans;
    try {
      const step = runner.step(hours.mayHold ? 'later' : 'now');
      if (!step) {
        line.mayStep = false;
        return false;
      }
      counters.add('scans');
      counters.add(step.closed.cause === 'complete' ? 'scans_complete' : 'scans_deadline');
      if (step.closed.reported === 0) counters.add('scans_empty');
      counters.add('scans_skipped', runner.skippedScans - skipped);
      if (step.step.counts) counters.addScan(step.step.counts);
      if (step.hoursDue) hours.hold(runner, step, (failure) => this.resume(runner, step, failure));
      else this.enter(runner, step);
    } catch (thrown) {
      this.failed(runner, thrown);
    }
    return true;
  }

  private enter(runner: UnitRunner, step: RunnerStep): void {
    this.failing.delete(runner.unit.id);
    this.options.entering.enter(runner, step);
  }

  /** A step that was held has its hours, or there can be none. */
  private resume(runner: UnitRunner, step: RunnerStep, failure: unknown): void {
    try {
      if (failure !== undefined) throw failure;
      this.enter(runner, step);
    } catch (thrown) {
      this.failed(runner, thrown);
    }
    this.kick();
  }

  private failed(runner: UnitRunner, thrown: unknown): void {
    const { counters, notices, history, entering } = this.options;
    counters.add('scan_failures');
    counters.failed(thrown);
    this.failing.set(runner.unit.id, reasonOf(thrown));
    notices.warn(
      `scan_failures ${runner.unit.id}`,
      `unit ${runner.unit.id}: a scan could not be taken in: ${reasonOf(thrown)}`,
    );
    const standing = entering.standingOf(runner.unit.id);
    try {
      // One that is far ahead is of clocks that were.
      const end_ms = (runner.newest_ms ?? Number.POSITIVE_INFINITY) + LEAST_LEAD_MS;
      const saved = history.checkpoints.list(runner.unit);
      runner.recover(
        saved.find(({ time_ms }) => time_ms <= end_ms),
        standing,
      );
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
    clock_back: `is live by this machine's clock, and the unit stands further ahead: it waits`,
  }[fate];
  return `${entry.unit}, ${entry.channel}: the reading of ${time} ${why ?? 'has no such channel now'}`;
}
