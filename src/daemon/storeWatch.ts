import type { SetAside } from '../adapters/history/setAside.js';
import type { UnitDefinition } from '../core/definitions.js';
import type { EventKind, WatchEvent } from '../core/watch/event.js';
import { watchEvent } from '../core/watch/kinds.js';

const MB = 1e6;
/** Subject of the alarm of a full disk. */
const DISK = 'disk';

/** What is known of the store at a look. */
export interface StoreLook {
  readonly time_ms: number;
  /** Room for the store [bytes]; null where the machine does not tell. */
  readonly room: number | null;
  /** Why the journal or the history could not be written, null where they could. */
  readonly trouble: string | null;
}

/** Looks at writing in vain before it is told: one may be another process that held the file. */
const VAIN_LOOKS = 2;

/** The alarm of a full disk, the same for every unit: raised and returned. */
export class StoreWatch {
  private vain = 0;
  private raised: boolean | null = null;

  /**
   * @param keep_free_MB room below which there is too little; 0: only what fails counts
   * @param stands whether the alarm stands from before this start
   */
  constructor(
    private readonly units: readonly UnitDefinition[],
    private readonly keep_free_MB: number,
    private readonly stands: () => boolean,
  ) {}

  /** Takes a look in, after what could be thinned has been; gives what was raised or returned by it. */
  step({ time_ms, room, trouble }: StoreLook): WatchEvent[] {
    this.raised ??= this.stands();
    this.vain = trouble === null ? 0 : this.vain + 1;
    const isShort = room !== null && room < this.keep_free_MB * MB;
    const isFull = this.vain >= VAIN_LOOKS || isShort;
    // Once raised it stays until both are well.
    const active = this.raised ? isShort || trouble !== null : isFull;
    if (active === this.raised) return [];
    this.raised = active;
    const left_MB = room === null ? null : room / MB;
    const left = left_MB === null ? '' : ` ${Math.round(left_MB)} MB are left.`;
    const message = !active
      ? `The local store is written to again.${left} What waited at the broker comes in now.`
      : trouble === null
        ? `The disk is nearly full.${left} What rockhour keeps has been thinned as far as it may be; ` +
          'make room before readings can no longer be taken in.'
        : `The local store cannot be written: ${trouble}.${left} Readings are not acknowledged and wait ` +
          'at the broker. Make room on the disk.';
    const transition = active ? 'raised' : 'returned';
    const value = left_MB === null ? null : Math.round(left_MB);
    return this.of('disk_full', DISK, transition, time_ms, message, value, this.keep_free_MB);
  }

  /** A damaged file was set aside: told and over, so that it is listed until it is acknowledged. */
  damaged(file: 'journal' | 'history', what: SetAside, time_ms: number): WatchEvent[] {
    const told =
      `The ${file} was damaged (${what.reason}) and was set aside as ${what.kept}. ` +
      `A fresh one was begun with ${what.rows} rows that could still be read` +
      (what.lost === undefined ? '.' : `; ${what.lost} entries are lost.`);
    return [
      ...this.of('store_damaged', file, 'raised', time_ms, told, null, null),
      ...this.of(
        'store_damaged',
        file,
        'returned',
        time_ms,
        `The fresh ${file} is in use.`,
        null,
        null,
      ),
    ];
  }

  private of(
    kind: EventKind,
    subject: string,
    transition: WatchEvent['transition'],
    time_ms: number,
    message: string,
    value: number | null,
    limit: number | null,
  ): WatchEvent[] {
    const parts = { kind, subject, transition, time_ms, message, value, limit };
    return this.units.map(({ id }) => watchEvent({ unit: id, ...parts }));
  }
}
