import type { History } from '../adapters/history/history.js';
import type { AlarmAnswer } from '../adapters/http/service.js';
import type { AlarmsMessage } from '../adapters/mqtt/announcer.js';
import type { AlarmsConfig } from '../config/site.js';
import {
  type AlarmCommand,
  type CommandFault,
  isFault,
  readCommand,
  staleFault,
} from '../core/alarm/command.js';
import { type AlarmEntry, inOrder } from '../core/alarm/entry.js';
import { WINDOW_MS } from '../core/alarm/flood.js';
import { readId, subjectsOf } from '../core/alarm/ids.js';
import { type AlarmReport, alarmReport } from '../core/alarm/report.js';
import { isHeldBack } from '../core/alarm/state.js';
import type { UnitDefinition } from '../core/definitions.js';
import type { WatchEvent } from '../core/watch/event.js';
import { reasonOf } from '../errors.js';
import type { Log } from '../log.js';
import type { DaemonClock } from './clock.js';
import type { Counters } from './counters.js';
import { DATABASE } from './databaseWatch.js';
import type { Notices } from './notices.js';

export const DEFAULT_ALARMS: AlarmsConfig = { shelve_most_h: 8, out_of_service: [], latching: [] };

export interface AlarmPartOptions {
  readonly config: AlarmsConfig;
  readonly units: readonly UnitDefinition[];
  readonly history: History;
  readonly clock: DaemonClock;
  readonly counters: Counters;
  readonly notices: Notices;
  readonly log: Log;
  /** Everything in the journal is in the estimates: the time of the readings is now. */
  isUpToDate(): boolean;
  announce(message: AlarmsMessage): void;
  /** An event that is new. */
  raised(event: WatchEvent): void;
  /** The list of a unit is another one. */
  changed(unit: string): void;
}

/** The list of a unit is said at most so often [ms]: a storm of events is one message. */
const SAY_EVERY_MS = 250;
const TICK_MS = 1000;
/** Longest list in one message; HTTP has all of it. */
const MOST_SAID = 200;
/** Ids that a fault names. */
const MOST_NAMED = 20;

/** Alarms between history and whoever is told of them or answers: list, commands, figures. */
export class AlarmPart {
  /** Units whose list is to be said, with what happened last there. */
  private readonly waiting = new Map<string, WatchEvent | null>();
  private saying: NodeJS.Timeout | null = null;
  private ticking: NodeJS.Timeout | null = null;
  private said_ms = Number.NEGATIVE_INFINITY;

  constructor(private readonly options: AlarmPartOptions) {}

  /** Once what happened while it was away has been taken in. */
  start(): void {
    const { history, clock } = this.options;
    history.write(() => {
      history.alarms.start(Math.floor(clock.now()));
      this.returnOfGoneUnits();
    });
    const period_ms = Math.max(20, TICK_MS / Math.max(1, clock.speed));
    this.ticking ??= setInterval(() => this.passTime(), period_ms);
    for (const { id } of this.options.units) this.say(id, null);
    this.flush();
  }

  stop(): void {
    if (this.ticking) clearInterval(this.ticking);
    this.ticking = null;
    // The list is said anew at the next start.
    if (this.saying) clearTimeout(this.saying);
    this.saying = null;
  }

  event(event: WatchEvent): void {
    const { counters, log, raised } = this.options;
    counters.add('events');
    const { id: event_id, transition, priority } = event;
    log.info({ event: event_id, transition, priority }, event.message);
    this.say(event.unit, event);
    raised(event);
  }

  /** States have changed without an event: a rule, the time, a person. */
  moved(unit: string): void {
    this.say(unit, null);
    this.options.changed(unit);
  }

  get shelveMost_h(): number {
    return this.options.config.shelve_most_h;
  }

  shown(unit?: string): AlarmEntry[] {
    return inOrder(this.entries(unit).filter(({ state }) => !isHeldBack(state)));
  }

  heldBack(unit?: string): AlarmEntry[] {
    return inOrder(this.entries(unit).filter(({ state }) => isHeldBack(state)));
  }

  /**
   * Follows a command of whoever gave it, or says what is wrong with it.
   * @param unit the unit it was sent to; null: any
   * @throws RockhourError STORE_FAILED where it cannot be put on disk
   */
  command(value: unknown, unit: string | null = null): AlarmAnswer {
    const { config, history, clock, counters, log } = this.options;
    const read = readCommand(value, config.shelve_most_h);
    if (isFault(read)) return this.refuse(read);
    const fault = this.faultOf(read, unit);
    if (fault !== null) return this.refuse(fault);
    const { id, action, who } = read;
    const refused = history.alarms.command(read, Math.floor(clock.now()));
    if (refused !== null) {
      const expected = `an action that fits: ${refused}`;
      return this.refuse({ code: 'wrong_state', field: 'action', value: action, expected });
    }
    counters.add('alarm_commands');
    log.info({ event: id, action, who }, `${who}: ${action} ${id}`);
    const entry = history.alarms.entry(id);
    this.moved(readId(id)?.unit ?? id);
    return { accepted: true, command: read, entry };
  }

  report(unit: string | undefined, from_ms: number, to_ms: number): AlarmReport {
    const { alarms } = this.options.history;
    return alarmReport({
      ...{ unit: unit ?? null, from_ms, to_ms, entries: alarms.entries(unit) },
      annunciations: alarms.annunciations(unit, 'alarm', from_ms - WINDOW_MS, to_ms),
      alerts: alarms.annunciations(unit, 'alert', from_ms, to_ms).length,
    });
  }

  /** What stands of a unit that is configured no more would stand for ever. */
  private returnOfGoneUnits(): void {
    const { history, units, clock } = this.options;
    const time = new Date(clock.now()).toISOString();
    for (const event of history.alarms.active()) {
      if (units.some(({ id }) => id === event.unit)) continue;
      const message = `Unit ${event.unit} is not in the configuration any more.`;
      history.events.add({ ...event, transition: 'returned', time, message });
    }
  }

  private refuse(fault: CommandFault): AlarmAnswer {
    this.options.counters.add('alarm_commands_refused');
    return { accepted: false, fault };
  }

  private entries(unit: string | undefined): AlarmEntry[] {
    return this.options.history.alarms.entries(unit);
  }

  /** What is wrong with a sound command for this plant. */
  private faultOf(command: AlarmCommand, unit: string | null): CommandFault | null {
    const { id, action } = command;
    const { history, clock } = this.options;
    const wrong = (expected: string): CommandFault => {
      return { code: 'unknown_event', field: 'id', value: id, expected };
    };
    if (unit !== null && !id.startsWith(`${unit}/`))
      return wrong(`an id that begins with ${unit}/`);
    const stale = staleFault(command, history.alarms.entry(id), clock.now());
    if (stale !== null || history.alarms.has(id)) return stale;
    if (action === 'acknowledge' || action === 'reset' || action === 'unshelve') {
      const ids = this.entries(unit ?? undefined).map((entry) => entry.id);
      return wrong(
        ids.length === 0
          ? 'none stands at present'
          : `one of ${ids.slice(0, MOST_NAMED).join(', ')}`,
      );
    }
    const parts = readId(id);
    const definition = this.options.units.find((one) => one.id === parts?.unit);
    if (parts === null || definition === undefined)
      return wrong('UNIT/KIND/SUBJECT with a unit of this site and a known kind');
    const subjects = subjectsOf(definition, parts.kind, [DATABASE]);
    if (subjects.includes(parts.subject)) return null;
    const start = `${parts.unit}/${parts.kind}/`;
    return wrong(
      subjects.length === 0
        ? `another kind: ${parts.unit} has nothing that ${parts.kind} is raised of`
        : `${start} and one of ${subjects.slice(0, MOST_NAMED).join(', ')}`,
    );
  }

  private passTime(): void {
    const { history, clock, counters, notices, isUpToDate } = this.options;
    if (!isUpToDate()) return;
    try {
      const now_ms = Math.floor(clock.now());
      for (const unit of history.write(() => history.alarms.passTime(now_ms))) this.moved(unit);
    } catch (thrown) {
      counters.add('history_failures');
      counters.failed(thrown);
      notices.warn('history_failures', reasonOf(thrown));
    }
  }

  private say(unit: string, event: WatchEvent | null): void {
    this.waiting.set(unit, event ?? this.waiting.get(unit) ?? null);
    const wait_ms = Math.max(0, this.said_ms + SAY_EVERY_MS - performance.now());
    this.saying ??= setTimeout(() => this.flush(), wait_ms);
  }

  private flush(): void {
    if (this.saying) clearTimeout(this.saying);
    this.saying = null;
    this.said_ms = performance.now();
    const { clock, announce } = this.options;
    for (const [unit, last] of this.waiting) {
      const time = last?.time ?? new Date(clock.now()).toISOString();
      const [standing, suppressed] = [this.shown(unit), this.heldBack(unit)];
      announce({
        ...{ time, unit, standing: standing.slice(0, MOST_SAID), last },
        suppressed: suppressed.slice(0, MOST_SAID),
        counts: countStates([...standing, ...suppressed]),
        left_out:
          Math.max(0, standing.length - MOST_SAID) + Math.max(0, suppressed.length - MOST_SAID),
      });
    }
    this.waiting.clear();
  }
}

function countStates(entries: readonly AlarmEntry[]): Record<string, number> {
  const counts: Record<string, number> = {};
  for (const { state } of entries) counts[state] = (counts[state] ?? 0) + 1;
  return counts;
}
