import type { UnitDefinition } from '../../core/definitions.js';

/** What a scan has of its channels. */
interface Row {
  /** Per channel 0 = nothing, 1 = a bad reading, 2 = a value. */
  readonly rank: Uint8Array;
  /** Source times of readings that a copy may follow, by channel. */
  readonly times: Map<number, number[]>;
}

/**
 * Which of the late readings have a place of their own: where their scan has no value of a periodic
 * channel, and every change that a channel told by exception. A copy of what is known is of no use, so
 * that a plant that sends yesterday once more changes nothing. Only scans that late readings are
 * expected in are looked at.
 */
export class Gaps {
  private readonly rows = new Map<number, Row>();
  private readonly period_ms: number;
  private readonly isPeriodic: readonly boolean[];

  constructor(unit: UnitDefinition) {
    this.period_ms = unit.scan_period_s * 1000;
    this.isPeriodic = unit.channels.map(({ reporting }) => reporting.kind === 'periodic');
  }

  /** A late reading of this time will be asked about. */
  expect(time_ms: number): void {
    const index = this.indexOf(time_ms);
    if (this.rows.has(index)) return;
    this.rows.set(index, { rank: new Uint8Array(this.isPeriodic.length), times: new Map() });
  }

  /** A reading that is in its scan. */
  fill(channel: number, time_ms: number, value: number): void {
    const row = this.rows.get(this.indexOf(time_ms));
    if (!row) return;
    if (this.isPeriodic[channel]) row.rank[channel] = Math.max(row.rank[channel]!, rankOf(value));
    else isNewTime(row, channel, time_ms);
  }

  /** Whether a late reading has a place of its own; asked once for each, in the order of arrival. */
  isOfUse(channel: number, time_ms: number, value: number): boolean {
    const row = this.rows.get(this.indexOf(time_ms));
    if (!row || row.rank[channel]! >= rankOf(value)) return false;
    return isNewTime(row, channel, time_ms);
  }

  private indexOf(time_ms: number): number {
    return Math.floor(time_ms / this.period_ms);
  }
}

function isNewTime({ times }: Row, channel: number, time_ms: number): boolean {
  const known = times.get(channel) ?? [];
  times.set(channel, known);
  if (known.includes(time_ms)) return false;
  known.push(time_ms);
  return true;
}

function rankOf(value: number): number {
  return Number.isNaN(value) ? 1 : 2;
}
