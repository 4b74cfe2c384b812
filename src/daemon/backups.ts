import type { History } from '../adapters/history/history.js';
import type { Journal } from '../adapters/history/journal.js';
import { packBackup, unpackBackup } from '../adapters/history/unitBackup.js';
import type { RestoreAnswer } from '../adapters/http/service.js';
import { reasonOf } from '../errors.js';
import type { DaemonClock } from './clock.js';
import type { Counters } from './counters.js';
import { startOf } from './rewind/given.js';
import type { Rewinder } from './rewind/rewinder.js';
import type { UnitRunner } from './unitRunner.js';

export interface BackupsOptions {
  readonly site: string;
  readonly version: string;
  readonly journal: Journal;
  readonly history: History;
  readonly clock: DaemonClock;
  readonly counters: Counters;
  readonly rewinder: Pick<Rewinder, 'goOnFrom'>;
  readonly future_tolerance_ms: number;
  fresh(unit: UnitRunner['unit']): UnitRunner;
}

/** States of units out of the running daemon as files, and back into it. */
export class Backups {
  private readonly busy = new Set<string>();

  constructor(private readonly options: BackupsOptions) {}

  /** null before the unit's first scan, and before a saved state is taken over. */
  make(runner: UnitRunner): Uint8Array | null {
    const { site, version, journal, clock } = this.options;
    const checkpoint = runner.checkpoint(false);
    if (checkpoint === null) return null;
    return packBackup({
      ...checkpoint,
      ...{ unit: runner.unit.id, site, version },
      made: new Date(clock.now()).toISOString(),
      anchor: journal.at(checkpoint.journal_seq) ?? null,
    });
  }

  /** Held against the unit wholly before anything changes; resolves when it is in its place. */
  async restore(runner: UnitRunner, file: Uint8Array, who: string): Promise<RestoreAnswer> {
    const { id } = runner.unit;
    const { journal, history, clock, rewinder, fresh, counters } = this.options;
    if (this.busy.has(id) || runner.isAwaiting) {
      const fault = `unit ${id} is being put back to another state; ask again when that is done`;
      return { accepted: false, is: 'busy', fault };
    }
    try {
      const start = startOf(unpackBackup(file), who, {
        ...{ journal, history, now_ms: clock.now(), fresh: () => fresh(runner.unit) },
        future_tolerance_ms: this.options.future_tolerance_ms,
      });
      this.busy.add(id);
      const record = await rewinder.goOnFrom(start);
      const { anew, lost, reaches, shape } = start;
      runner.lost = lost;
      counters.add('baselines_lost', lost.length);
      return { accepted: true, record, same_shape: shape === null, reaches, anew, lost };
    } catch (thrown) {
      if (this.busy.has(id)) throw thrown;
      counters.add('restores_refused');
      return { accepted: false, is: 'unusable', fault: `the file ${reasonOf(thrown)}` };
    } finally {
      this.busy.delete(id);
    }
  }
}
