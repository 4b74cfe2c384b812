import type { Direction, Mode, OperationDefinition } from '../definitions.js';
import type { Piece, RunningBefore, Unmet } from './command.js';
import type { Part } from './commandParts.js';
import { SLIVER_S } from './commandRamp.js';
import { type CommandCause, signedPower } from './leg.js';

/** The command as far as it is written: pieces one after the other, and how the unit runs then. */
export class CommandLine {
  readonly pieces: Piece[] = [];
  readonly unmet: Unmet[] = [];
  at = 0;
  mode: Mode;
  /** Size of the power [W]. */
  power_W: number;
  /** The leg that runs. */
  leg = -1;
  last: Direction | null;
  /** When the unit came to stand, seen from the plan's start. */
  stoodFrom: number;
  /** Why the run at hand began late, if it did. */
  late: CommandCause = 'start_up';
  /** Parts of legs in which the unit stands, by request or because it cannot run. */
  private readonly idles: Part[] = [];

  /**
   * @param stand_W net power while standing, at most 0
   * @param end_s where it ends at the latest
   */
  constructor(
    private readonly operation: OperationDefinition,
    readonly stand_W: number,
    before: RunningBefore,
    private readonly end_s: number,
  ) {
    this.mode = before.mode;
    this.power_W = before.mode === 'stand' ? 0 : Math.abs(before.power_W);
    this.last = before.mode === 'stand' ? before.last : before.mode;
    this.stoodFrom = -before.stood_s;
  }

  put(
    to_s: number,
    mode: Mode,
    power0_W: number,
    power1_W: number,
    leg: number,
    purpose: Piece['purpose'],
  ): void {
    const cut = Math.min(to_s, this.end_s);
    if (!(cut > this.at)) return;
    const share = (cut - this.at) / (to_s - this.at);
    const last_W = to_s === cut ? power1_W : power0_W + (power1_W - power0_W) * share;
    this.pieces.push({
      from_s: this.at,
      to_s: cut,
      mode,
      power0_W,
      power1_W: last_W,
      leg,
      purpose,
    });
    this.at = cut;
  }

  /**
   * Sizes of power [W]; a zero is never negative.
   *
   * @returns mean of what was put [W]
   */
  run(to_s: number, power0_W: number, power1_W: number, purpose: 'run' | 'ramp'): number {
    const signed = (power: number): number => signedPower(this.mode, power) + 0;
    this.put(to_s, this.mode, signed(power0_W), signed(power1_W), this.leg, purpose);
    this.power_W = power1_W;
    const put = this.pieces[this.pieces.length - 1];
    return put === undefined ? power0_W : Math.abs(put.power0_W + put.power1_W) / 2;
  }

  /** @returns whether that took any time */
  rampDown(): boolean {
    if (this.mode === 'stand') return false;
    const rate = this.operation.ramp_W_s[this.mode];
    const from_s = this.at;
    const time_s = rate === null ? 0 : this.power_W / rate;
    if (time_s > SLIVER_S) this.run(this.at + time_s, this.power_W, 0, 'ramp');
    this.last = this.mode;
    this.mode = 'stand';
    this.power_W = 0;
    this.stoodFrom = this.at;
    return this.at > from_s;
  }

  idle(part: Part): void {
    this.idles.push(part);
  }

  /** Stands until a time; what falls into a leg that stands belongs to it. */
  stand(to_s: number): void {
    while (to_s > this.at && this.at < this.end_s) {
      const own = this.idles.find((idle) => idle.from_s <= this.at && idle.to_s > this.at);
      const next = this.idles.find((idle) => idle.from_s > this.at);
      const until = Math.min(to_s, own?.to_s ?? next?.from_s ?? Number.POSITIVE_INFINITY);
      this.put(until, 'stand', this.stand_W, this.stand_W, own?.index ?? -1, 'stand');
    }
  }

  lacks(
    leg: number,
    cause: CommandCause,
    from_s: number,
    until_s: number,
    missing_W: number,
  ): void {
    const to_s = Math.min(until_s, this.end_s);
    if (to_s > from_s && missing_W > 0) this.unmet.push({ leg, cause, from_s, to_s, missing_W });
  }
}
