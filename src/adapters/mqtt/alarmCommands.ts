import type { CommandFault } from '../../core/alarm/command.js';
import { RockhourError, reasonOf } from '../../errors.js';
import type { Delivery } from './link.js';

/** What became of a command: followed, with the state it led to, or the fault. */
export type CommandResult =
  | { readonly accepted: true; readonly state: string }
  | { readonly accepted: false; readonly fault: CommandFault };

export interface AlarmCommandsOptions {
  readonly prefix: string;
  readonly units: readonly string[];
  /** Wall clock [ms since 1970]. */
  now(): number;
  /** Follows a command that came for a unit. May throw where the disk refuses. */
  follow(command: unknown, unit: string): CommandResult;
  /** Publishes an answer, not retained; false where it cannot be sent. */
  answer(topic: string, payload: string): boolean;
  malformed(text: string): void;
  lost(): void;
}

/** Longest command that is looked at [bytes]; a sound one has fewer than a thousand. */
const LONGEST = 4096;
const SHOWN = 120;

/**
 * Commands about alarms from the plant's own system:
 *
 * - `PREFIX/UNIT/alarms/command`  `{"id", "action", "who", "hours"?, "why"?, "time"?}`
 * - `PREFIX/UNIT/alarms/answer`   `{"time", "unit", "accepted", "state", "fault", "command"}`
 *
 * Every command is answered; it is acknowledged to the broker once it has been followed and is on the
 * disk. What the broker kept as retained is refused when it hands it out at a connection; published
 * while connected such a message cannot be told from another, and is followed. What waited at the broker
 * through an outage is followed as well, unless `time` says that it is stale.
 */
export class AlarmCommands {
  private readonly unitOf: ReadonlyMap<string, string>;

  constructor(private readonly options: AlarmCommandsOptions) {
    this.unitOf = new Map(
      options.units.map((unit) => [`${options.prefix}/${unit}/alarms/command`, unit]),
    );
  }

  get topics(): string[] {
    return [...this.unitOf.keys()];
  }

  isFor({ topic }: Pick<Delivery, 'topic'>): boolean {
    return this.unitOf.has(topic);
  }

  /** false where the message is none of these. */
  receive({ topic, payload, retained, acknowledge }: Delivery): boolean {
    const unit = this.unitOf.get(topic);
    if (unit === undefined) return false;
    // An empty retained message only deletes another one.
    if (payload.length > 0) {
      const { command, result } = this.resultOf(unit, payload, retained === true);
      this.say(unit, command, result);
    }
    acknowledge?.();
    return true;
  }

  private resultOf(
    unit: string,
    payload: Buffer,
    isRetained: boolean,
  ): { command: unknown; result: CommandResult } {
    const { follow, malformed } = this.options;
    const text = payload.toString('utf8');
    const shown = text.length > SHOWN ? `${text.slice(0, SHOWN)}...` : text;
    const refuse = (expected: string) => {
      malformed(`alarm command for unit ${unit}: ${shown}`);
      return { command: shown, result: refused(null, shown, expected) };
    };
    if (payload.length > LONGEST) return refuse(`at most ${LONGEST} bytes of JSON`);
    if (isRetained) return refuse('a message that is not retained');
    let command: unknown;
    try {
      command = JSON.parse(text);
    } catch {
      return refuse('JSON {"id", "action", "who", "hours", "why", "time"}');
    }
    try {
      return { command, result: follow(command, unit) };
    } catch (thrown) {
      const said = reasonOf(thrown);
      const wanted =
        thrown instanceof RockhourError ? 'a disk that takes it' : 'no fault of rockhour';
      return { command, result: refused(null, null, `${wanted}: ${said}`) };
    }
  }

  private say(unit: string, command: unknown, result: CommandResult): void {
    const { prefix, now, answer, lost } = this.options;
    const content = {
      time: new Date(now()).toISOString(),
      unit,
      accepted: result.accepted,
      state: result.accepted ? result.state : null,
      fault: result.accepted ? null : result.fault,
      command,
    };
    if (!answer(`${prefix}/${unit}/alarms/answer`, JSON.stringify(content))) lost();
  }
}

function refused(field: string | null, value: unknown, expected: string): CommandResult {
  return { accepted: false, fault: { code: 'wrong_value', field, value, expected } };
}
