import { mkdirSync } from 'node:fs';
import { join } from 'node:path';
import { freePort } from '../../test/support/ports.js';
import { type Service, startInflux, startMosquitto } from '../../test/support/services.js';
import { ChaosDaemon } from './daemon.js';
import { FaultyDatabase } from './faultyDatabase.js';
import { countScans, type Ledger, ledgerOf, outstanding } from './ledger.js';
import { ChaosPlant, type ChaosSite, writeSite } from './plant.js';
import { Random } from './random.js';

export interface Programs {
  readonly mosquitto: string;
  readonly influxd: string;
}

/** Without any progress for so long a run is taken to be at its end [ms]. */
const STILL_MS = 60_000;
const LOOK_MS = 200;

/** Broker, database, daemon and plant of one run, in a folder of its own. */
export class Ground {
  private constructor(
    readonly folder: string,
    readonly random: Random,
    readonly broker: Service,
    private readonly influx: Service,
    readonly database: FaultyDatabase,
    readonly chaos: ChaosSite,
    readonly daemon: ChaosDaemon,
    readonly plant: ChaosPlant,
  ) {}

  /**
   * @param store folder of the daemon's store
   * @param env of the daemon's process
   */
  static async make(
    programs: Programs,
    folder: string,
    seed: number,
    store = join(folder, 'data'),
    env: Readonly<Record<string, string>> = {},
  ): Promise<Ground> {
    const places = ['mosquitto', 'influx', 'data'].map((name) => join(folder, name));
    for (const place of places) mkdirSync(place, { recursive: true });
    const random = new Random(seed);
    const broker = await startMosquitto(programs.mosquitto, undefined, [], {
      folder: places[0]!,
    });
    const influx = await startInflux(programs.influxd, undefined, [], places[1]!);
    const database = new FaultyDatabase(await freePort(), influx.url);
    await database.start();
    const chaos = writeSite(folder, store, broker.url, database.url);
    const daemon = new ChaosDaemon(chaos.path, env);
    // Once before the plant speaks: a broker keeps nothing for a session that never was.
    await daemon.start();
    const plant = new ChaosPlant(chaos, broker.url, random);
    await plant.start();
    return new Ground(folder, random, broker, influx, database, chaos, daemon, plant);
  }

  /** Waits until the daemon has worked all off, ends it, and counts. */
  async reckon(): Promise<Ledger> {
    const { plant, chaos, daemon, database, influx } = this;
    await plant.stop();
    let left = '';
    let changed = performance.now();
    for (;;) {
      // Scans first: one that is stored between two looks has yet to be forwarded.
      const now = this.scansLeft() ?? outstanding(chaos, plant.acknowledged);
      if (now === null) break;
      if (now !== left) changed = performance.now();
      left = now;
      if (performance.now() - changed > STILL_MS) break;
      await pause(LOOK_MS);
    }
    await daemon.end('SIGTERM');
    return ledgerOf({
      ...{ chaos, acknowledged: plant.acknowledged, scans: plant.scans },
      ...{ refused: database.refused.size, databaseUrl: influx.url },
    });
  }

  async stop(): Promise<void> {
    this.plant.pause();
    await this.daemon.end('SIGKILL');
    await this.database.stop();
    await this.broker.stop();
    await this.influx.stop();
  }

  private scansLeft(): string | null {
    const { scans } = this.plant;
    const { told, committed } = countScans(this.chaos, scans);
    const left = scans.size - told - committed;
    return left > 0 ? `${left} scans` : null;
  }
}

export function pause(ms: number): Promise<void> {
  return new Promise((resolve) => setTimeout(resolve, ms));
}
