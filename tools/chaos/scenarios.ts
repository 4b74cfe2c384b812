import { spawnSync } from 'node:child_process';
import { mkdirSync, rmSync, statfsSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import type { DatabaseMood } from './faultyDatabase.js';
import { Ground, type Programs, pause } from './ground.js';
import type { Ledger } from './ledger.js';

/** One run of a scenario: so many rounds, in a folder of its own. */
export interface Run {
  readonly programs: Programs;
  readonly folder: string;
  readonly rounds: number;
  readonly seed: number;
}

export interface Scenario {
  readonly name: string;
  /** What a round is. */
  readonly round: string;
  /** Rounds in all, and in one run: what is done is kept run by run. */
  readonly rounds: number;
  readonly per_run: number;
  run(run: Run): Promise<Ledger>;
}

const SCANS_PER_S = 10;
/** A day of scans every 30 s. */
const DAY_SCANS = 2880;
/** Room of the small disk [MB]: journal, history and their logs, and little more. */
const DISK_MB = 24;
const HOUR_S = 3600;

async function on(
  run: Run,
  act: (ground: Ground) => Promise<void>,
  store?: string,
  env?: Readonly<Record<string, string>>,
): Promise<Ledger> {
  const ground = await Ground.make(run.programs, run.folder, run.seed, store, env);
  try {
    await act(ground);
    return await ground.reckon();
  } finally {
    await ground.stop();
  }
}

/** Killed at a random moment, one time in four while it still starts. */
function kills(run: Run): Promise<Ledger> {
  return on(run, async ({ daemon, plant, random }) => {
    plant.load(SCANS_PER_S);
    for (let round = 0; round < run.rounds; round++) {
      await pause(random.between(0, 1500));
      await daemon.end('SIGKILL');
      daemon.spawn();
      if (random.next() < 0.25) await pause(random.between(0, 2000));
      else await daemon.ready();
    }
    await daemon.end('SIGKILL');
    await daemon.start();
  });
}

function brokerRestarts(run: Run): Promise<Ledger> {
  return on(run, async ({ broker, plant, random }) => {
    plant.load(SCANS_PER_S);
    for (let round = 0; round < run.rounds; round++) {
      await pause(random.between(200, 1500));
      await broker.stop();
      await pause(random.between(0, 500));
      await broker.start();
    }
  });
}

/** As many hours as rounds pass in the plant while the database is gone. */
function databaseGone(run: Run): Promise<Ledger> {
  return on(run, async ({ database, plant }) => {
    await plant.publish(5);
    await database.stop();
    await plant.publish(Math.ceil((run.rounds * DAY_SCANS) / 24));
    await database.start();
  });
}

function databaseMood(mood: DatabaseMood): Scenario['run'] {
  return (run) =>
    on(run, async ({ database, plant }) => {
      database.mood = mood;
      plant.load(SCANS_PER_S);
      for (let round = 0; round < run.rounds; round++) {
        const before = database.faults;
        for (let waited = 0; database.faults === before && waited < 60_000; waited += 50) {
          await pause(50);
        }
      }
      // Points that are refused are refused for good; the rest must follow.
      if (mood !== 'refuse') database.mood = 'pass';
    });
}

/** The process's own file limit: no file grows, as on a full disk, whatever the machine permits. */
function limitFiles(pid: number, bytes: number | null): boolean {
  const limit = `--fsize=${bytes ?? 'unlimited'}:`;
  return spawnSync('prlimit', ['--pid', String(pid), limit]).status === 0;
}

/** A disk of its own where the machine lets one be mounted; else no file of the daemon may grow. */
async function diskFull(run: Run): Promise<Ledger> {
  const disk = join(run.folder, 'disk');
  mkdirSync(disk, { recursive: true });
  const options = ['-t', 'tmpfs', '-o', `size=${DISK_MB}m`, 'none', disk];
  const isMounted = spawnSync('mount', options).status === 0;
  const ballast = join(disk, 'ballast');
  const fill = (pid: number) => {
    if (!isMounted) return limitFiles(pid, 1);
    const { bavail, bsize } = statfsSync(disk);
    try {
      writeFileSync(ballast, Buffer.alloc(bavail * bsize));
    } catch {
      // The daemon took some of it meanwhile: full is what it should be.
    }
    return true;
  };
  const empty = (pid: number) => (isMounted ? rmSync(ballast) : limitFiles(pid, null));
  try {
    const act = async ({ daemon, plant, random }: Ground) => {
      plant.load(SCANS_PER_S);
      for (let round = 0; round < run.rounds; round++) {
        await pause(random.between(200, 1000));
        if (!fill(daemon.pid)) throw new Error('the disk cannot be filled: prlimit is refused');
        await pause(random.between(1500, 4000));
        // Some of the time a power cut comes on top.
        if (isMounted && random.next() < 0.3) await daemon.end('SIGKILL');
        empty(daemon.pid);
        if (daemon.pid === 0) await daemon.start();
      }
    };
    return await on(run, act, isMounted ? join(disk, 'data') : undefined);
  } finally {
    if (isMounted) spawnSync('umount', [disk]);
  }
}

/** Hours ahead, hours back, and 1970, while readings go on; at the end it is right again. */
function clockJumps(run: Run): Promise<Ledger> {
  const file = join(run.folder, 'clock');
  const set = (shift_s: number) => writeFileSync(file, String(shift_s));
  set(0);
  const hook = fileURLToPath(new URL('clockShift.mjs', import.meta.url));
  const env = { NODE_OPTIONS: `--import=${hook}`, CHAOS_CLOCK_FILE: file };
  const act = async ({ plant, random }: Ground) => {
    plant.load(SCANS_PER_S);
    for (let round = 0; round < run.rounds; round++) {
      const to_1970_s = -Date.now() / 1000;
      const jumps = [HOUR_S, -2 * HOUR_S, 26 * HOUR_S, to_1970_s];
      set(jumps[round % jumps.length]!);
      await pause(random.between(300, 1500));
      set(0);
      await pause(random.between(300, 1000));
    }
  };
  return on(run, act, undefined, env);
}

export const SCENARIOS: readonly Scenario[] = [
  { name: 'kill', round: 'kill -9', rounds: 100, per_run: 10, run: kills },
  { name: 'broker', round: 'restart of the broker', rounds: 50, per_run: 10, run: brokerRestarts },
  { name: 'gone', round: 'hour without InfluxDB', rounds: 24, per_run: 24, run: databaseGone },
  { name: 'hung', round: 'request not answered', rounds: 6, per_run: 6, run: databaseMood('hang') },
  { name: 'error', round: 'answer 500', rounds: 6, per_run: 6, run: databaseMood('error') },
  {
    ...{ name: 'refused', round: 'request with a refused point', rounds: 100, per_run: 100 },
    run: databaseMood('refuse'),
  },
  { name: 'disk', round: 'full disk', rounds: 20, per_run: 5, run: diskFull },
  { name: 'clock', round: 'jump of the clock', rounds: 20, per_run: 20, run: clockJumps },
];
