import { DESIGN_RULES, heldByDesign } from '../../core/alarm/byDesign.js';
import { type AlarmCommand, inputOf } from '../../core/alarm/command.js';
import { type AlarmEntry, entryOf, type RecordedTransition } from '../../core/alarm/entry.js';
import type { Annunciation } from '../../core/alarm/figures.js';
import { type AlarmId, covers, readId } from '../../core/alarm/ids.js';
import { type AlarmState, isForgettable, isHeldBack, NORMAL } from '../../core/alarm/state.js';
import { type AlarmInput, type AlarmStep, stepAlarm } from '../../core/alarm/step.js';
import { tellingOf } from '../../core/alarm/telling.js';
import type { Mode } from '../../core/definitions.js';
import type { EventKind, WatchEvent } from '../../core/watch/event.js';
import { KIND_CLASSES } from '../../core/watch/kinds.js';
import { type Database, storeFailure } from './database.js';

/** What the configuration says of alarms. */
export interface AlarmRules {
  /** Kinds that stay until they are reset. */
  readonly latching: readonly EventKind[];
  /** Kinds, `KIND/SUBJECT` or whole ids that are out of service. */
  readonly out_of_service: readonly string[];
}

interface AlarmRow {
  readonly id: string;
  readonly unit: string;
  readonly kind: EventKind;
  /** JSON of its AlarmState, and of the event that raised it last. */
  readonly alarm: string;
  readonly event: string | null;
}

/** In whose name the configuration takes alarms out of service. */
export const CONFIGURATION = 'configuration';
const NAMED = 'named in alarms.out_of_service';
const RULED = Object.keys(DESIGN_RULES) as EventKind[];
const LISTED = Object.keys(KIND_CLASSES) as EventKind[];
const marks = (list: readonly unknown[]) => list.map(() => '?').join(', ');
const SELECT = 'SELECT id, unit, kind, alarm, event FROM alarms';

/**
 * Alarms and alerts with their states after ISA-18.2, one row each, and every transition that led
 * there. What needs no remembering (normal, held back by nobody) has no row.
 */
export class Alarms {
  /** Mode of each unit by its newest scan; unknown until there is one. */
  private readonly modes = new Map<string, Mode>();
  private readonly statements: ReturnType<typeof statementsOf>;

  constructor(
    private readonly database: Database,
    private readonly rules: AlarmRules,
  ) {
    this.statements = statementsOf(database);
  }

  /** Holds what is stored against the configuration, once at a start. */
  start(now_ms: number): void {
    this.database.transaction(() => {
      for (const row of this.rows()) {
        const named = this.isNamed(row.id);
        const { service } = JSON.parse(row.alarm) as AlarmState;
        if (named && service === null) this.step(row, byConfiguration(true), now_ms);
        if (!named && service?.who === CONFIGURATION)
          this.step(row, byConfiguration(false), now_ms);
      }
    })();
  }

  /** A condition was raised or has returned. */
  take(event: WatchEvent): void {
    const time_ms = Date.parse(event.time);
    const raised = event.transition === 'raised';
    let row = this.row(event.id) ?? blank(event.id, event.unit, event.kind);
    if (raised) row = { ...row, event: JSON.stringify(event) };
    const { state, service, suppressed } = JSON.parse(row.alarm) as AlarmState;
    if (raised && service === null && this.isNamed(event.id))
      row = this.step(row, byConfiguration(true), time_ms);
    const mode = this.modes.get(event.unit) ?? null;
    const isShown = state !== 'normal' && !isHeldBack(state);
    if (raised && !suppressed && heldByDesign(event.kind, mode, isShown))
      row = this.step(row, { kind: 'suppressed' }, time_ms);
    this.step(row, { kind: raised ? 'raised' : 'returned' }, time_ms, event);
  }

  /**
   * A scan of a unit: its mode decides what rules hold back, its source time what is still shelved.
   * @returns whether anything has changed by it
   */
  scan(unit: string, mode: Mode, time_ms: number): boolean {
    this.modes.set(unit, mode);
    let changed = this.passTime(time_ms, unit).length > 0;
    const rows = this.statements.ruled.all(unit, ...RULED) as AlarmRow[];
    for (const row of rows) {
      const { state, suppressed } = JSON.parse(row.alarm) as AlarmState;
      const isShown = state !== 'normal' && !isHeldBack(state);
      const held = heldByDesign(row.kind, mode, isShown);
      if (held === suppressed) continue;
      this.step(row, { kind: held ? 'suppressed' : 'released' }, time_ms);
      changed = true;
    }
    return changed;
  }

  /** Lets shelves run out, of one unit or of all; the units in which one did. */
  passTime(now_ms: number, unit?: string): string[] {
    const rows = this.statements.due.all(now_ms, unit ?? null, unit ?? null) as AlarmRow[];
    for (const row of rows) this.step(row, { kind: 'time' }, now_ms);
    return [...new Set(rows.map((row) => row.unit))];
  }

  /**
   * Follows a person's word. It is on the disk when this returns: a power cut may not undo it.
   * @returns why it was refused, null where it was followed or changes nothing (acknowledged already)
   * @throws RockhourError STORE_FAILED where the disk does not take it; nothing has changed then
   */
  command(command: AlarmCommand, now_ms: number): string | null {
    const id = readId(command.id);
    let row = this.row(command.id) ?? (id && blank(command.id, id.unit, id.kind));
    if (!row) return 'there is no such alarm or alert';
    // One that was never raised is out of service all the same.
    if (this.isNamed(command.id) && (JSON.parse(row.alarm) as AlarmState).service === null)
      row = this.step(row, byConfiguration(true), now_ms);
    const alarm = JSON.parse(row.alarm) as AlarmState;
    if (command.action === 'acknowledge' && alarm.acknowledged !== null && !isHeldBack(alarm.state))
      return null;
    if (command.action === 'return_to_service' && this.isNamed(command.id))
      return `it is ${NAMED} of the configuration: take it out there`;
    const timing = { time_ms: now_ms, latching: this.isLatching(row.kind) };
    const step = stepAlarm(alarm, inputOf(command, now_ms), timing);
    if (step.refused !== null) return step.refused;
    this.database.pragma('synchronous = FULL');
    try {
      const moved = row;
      this.database.transaction(() => this.store(moved, step))();
    } catch (thrown) {
      throw storeFailure(`recording what ${command.who} did to ${command.id}`, thrown);
    } finally {
      this.database.pragma('synchronous = NORMAL');
    }
    return null;
  }

  has(id: string): boolean {
    return this.row(id) !== undefined;
  }

  entry(id: string): AlarmEntry | null {
    const row = this.row(id);
    return row ? entryOfRow(row) : null;
  }

  /** All that is not normal, of a unit or of all. */
  entries(unit?: string): AlarmEntry[] {
    return this.rows(unit).map(entryOfRow);
  }

  /** What the conditions themselves have raised and not given back, shown or not, as it was raised. */
  active(unit?: string): WatchEvent[] {
    return this.rows(unit).flatMap(({ alarm, event }) =>
      (JSON.parse(alarm) as AlarmState).active && event !== null
        ? [JSON.parse(event) as WatchEvent]
        : [],
    );
  }

  /** Transitions of a span of time, newest first, at most `most`. */
  transitions(
    of: { readonly unit?: string | undefined; readonly id?: string | undefined },
    from_ms: number,
    to_ms: number,
    most: number,
  ): RecordedTransition[] {
    const rows = this.database
      .prepare(
        `SELECT id, unit, kind, time, what, before, after, who, why FROM alarm_transitions
         WHERE time BETWEEN @from_ms AND @to_ms AND (@unit IS NULL OR unit = @unit)
           AND (@id IS NULL OR id = @id) ORDER BY time DESC, no DESC LIMIT @most`,
      )
      .all({ from_ms, to_ms, most, unit: of.unit ?? null, id: of.id ?? null }) as (Omit<
      RecordedTransition,
      'time'
    > & { time: number })[];
    return rows.map((row) => ({ ...row, time: new Date(row.time).toISOString() }));
  }

  /**
   * What was shown as unacknowledged in a span, of one class, in order of time: with the priority that it
   * was raised with last, which the time left may have made another than that of its kind.
   */
  annunciations(
    unit: string | undefined,
    which: WatchEvent['class'],
    from_ms: number,
    to_ms: number,
  ): Annunciation[] {
    const kinds = LISTED.filter((kind) => KIND_CLASSES[kind].class === which);
    const rows = this.database
      .prepare(
        `SELECT id, kind, time AS time_ms,
           (SELECT json_extract(json, '$.priority') FROM events WHERE events.id = alarm_transitions.id
             AND transition = 'raised' AND events.time <= alarm_transitions.time
             ORDER BY events.time DESC LIMIT 1) AS priority
         FROM alarm_transitions WHERE time BETWEEN ? AND ? AND (? IS NULL OR unit = ?) AND after = 'unacknowledged'
           AND before IS NOT 'unacknowledged' AND kind IN (${marks(kinds)}) ORDER BY time, no`,
      )
      .all(from_ms, to_ms, unit ?? null, unit ?? null, ...kinds) as {
      id: string;
      kind: EventKind;
      time_ms: number;
      priority: WatchEvent['priority'] | null;
    }[];
    return rows.map(({ id, kind, time_ms, priority }) => {
      return { id, time_ms, priority: priority ?? KIND_CLASSES[kind].priority };
    });
  }

  private step(row: AlarmRow, input: AlarmInput, time_ms: number, event?: WatchEvent): AlarmRow {
    const timing = { time_ms, latching: this.isLatching(row.kind) };
    return this.store(row, stepAlarm(JSON.parse(row.alarm) as AlarmState, input, timing), event);
  }

  /** @param event that brought the step about; absent: none did */
  private store(row: AlarmRow, { state, transition }: AlarmStep, event?: WatchEvent): AlarmRow {
    const stored = { ...row, alarm: JSON.stringify(state) };
    const { drop, put, record, tell } = this.statements;
    if (isForgettable(state)) drop.run(row.id);
    else put.run({ ...stored, state: state.state, until: state.shelf?.until_ms ?? null });
    const { id, unit, kind } = row;
    if (transition) record.run({ ...transition, id, unit, kind });
    const of = event ?? (row.event === null ? null : (JSON.parse(row.event) as WatchEvent));
    const told = tellingOf(JSON.parse(row.alarm) as AlarmState, transition, of);
    if (told !== null) tell.run(Date.parse(told.time), JSON.stringify(told));
    return stored;
  }

  private isLatching(kind: EventKind): boolean {
    return this.rules.latching.includes(kind);
  }

  private isNamed(text: string): boolean {
    const id = readId(text);
    return id !== null && this.rules.out_of_service.some((entry) => covers(entry, id));
  }

  private rows(unit?: string): AlarmRow[] {
    return this.database
      .prepare(`${SELECT} WHERE ? IS NULL OR unit = ?`)
      .all(unit ?? null, unit ?? null) as AlarmRow[];
  }

  private row(id: string): AlarmRow | undefined {
    return this.statements.row.get(id) as AlarmRow | undefined;
  }
}

/** What is asked with every event and every scan, made ready once. */
function statementsOf(database: Database) {
  return {
    row: database.prepare(`${SELECT} WHERE id = ?`),
    ruled: database.prepare(`${SELECT} WHERE unit = ? AND kind IN (${marks(RULED)})`),
    due: database.prepare(`${SELECT} WHERE until <= ? AND (? IS NULL OR unit = ?)`),
    drop: database.prepare('DELETE FROM alarms WHERE id = ?'),
    put: database.prepare(
      `INSERT OR REPLACE INTO alarms (id, unit, kind, state, until, alarm, event)
       VALUES (@id, @unit, @kind, @state, @until, @alarm, @event)`,
    ),
    record: database.prepare(
      `INSERT INTO alarm_transitions (id, unit, kind, time, what, before, after, who, why)
       VALUES (@id, @unit, @kind, @time_ms, @what, @before, @after, @who, @why)`,
    ),
    tell: database.prepare('INSERT INTO tellings (time, json) VALUES (?, ?)'),
  };
}

function entryOfRow({ id, unit, kind, alarm, event }: AlarmRow): AlarmEntry {
  const parts: AlarmId = readId(id) ?? { unit, kind, subject: id };
  const raised = event === null ? null : (JSON.parse(event) as WatchEvent);
  return entryOf(parts, JSON.parse(alarm) as AlarmState, raised);
}

function blank(id: string, unit: string, kind: EventKind): AlarmRow {
  return { id, unit, kind, alarm: JSON.stringify(NORMAL), event: null };
}

function byConfiguration(removed: boolean): AlarmInput {
  return { kind: removed ? 'removed' : 'restored', who: CONFIGURATION, why: NAMED };
}
