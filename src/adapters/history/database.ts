import { mkdirSync, statSync } from 'node:fs';
import { dirname } from 'node:path';
import SQLite from 'better-sqlite3';
import { fileReasonOf, RockhourError } from '../../errors.js';

export type Database = SQLite.Database;

/**
 * `full`: a commit is on the disk before it returns, a power cut undoes nothing. `normal`: a power
 * cut may undo the last commits, but only as a whole and in order.
 */
export type Durability = 'full' | 'normal';

/** One step per schema version; a step, once released, is never changed. */
export type Migrations = readonly string[];

/**
 * Makes a folder and those above it. Not `recursive`: where a folder can never be made, as below
 * /proc, that of Node 20 tries for ever.
 */
export function makeFolder(folder: string): void {
  if (isFolder(folder)) return;
  const above = dirname(folder);
  if (above !== folder) makeFolder(above);
  try {
    mkdirSync(folder);
  } catch (thrown) {
    // Another process may have been faster.
    if (!isFolder(folder)) throw thrown;
  }
}

function isFolder(path: string): boolean {
  return statSync(path, { throwIfNoEntry: false })?.isDirectory() ?? false;
}

/**
 * Pages of a file that stay in memory at most [KiB]: a quarter of what better-sqlite3 is built with,
 * filled within a day of one unit; the system keeps the rest of a file as long as it has room.
 */
const CACHE_KIB = 4000;

/**
 * Opens (or makes) a database file in WAL mode and brings its schema up to date.
 * @throws RockhourError STORE_FAILED where the folder, the disk or the file is at fault
 */
export function openDatabase(file: string, durability: Durability, steps: Migrations): Database {
  let database: Database | null = null;
  try {
    makeFolder(dirname(file));
    database = new SQLite(file, { timeout: 2000 });
    database.pragma('journal_mode = WAL');
    database.pragma(`synchronous = ${durability === 'full' ? 'FULL' : 'NORMAL'}`);
    database.pragma(`cache_size = -${CACHE_KIB}`);
    migrate(database, file, steps);
    return database;
  } catch (thrown) {
    database?.close();
    throw storeFailure(`opening ${file}`, thrown);
  }
}

/**
 * Opens a database file to read alone, beside a daemon that may be writing to it.
 * @throws RockhourError STORE_FAILED where there is none, it cannot be read, or is of another version
 */
export function openToRead(file: string, steps: Migrations): Database {
  let database: Database | null = null;
  try {
    database = new SQLite(file, { readonly: true, fileMustExist: true, timeout: 2000 });
    const version = Number(database.pragma('user_version', { simple: true }));
    if (version === steps.length) return database;
    throw new RockhourError(
      'STORE_FAILED',
      `reading ${file}: it has schema ${version}, this rockhour reads ${steps.length}`,
      {
        advice:
          version < steps.length
            ? 'Start this version of the daemon once: it brings the file up to date.'
            : 'Use the newer version that wrote it.',
      },
    );
  } catch (thrown) {
    database?.close();
    throw storeFailure(`reading ${file}`, thrown);
  }
}

function migrate(database: Database, file: string, steps: Migrations): void {
  const version = Number(database.pragma('user_version', { simple: true }));
  if (version > steps.length) {
    throw new RockhourError(
      'STORE_FAILED',
      `opening ${file}: it was written by a newer rockhour (schema ${version}, known ${steps.length})`,
      { advice: 'Run the newer version, or set another store.folder.' },
    );
  }
  database.transaction(() => {
    for (const step of steps.slice(version)) database.exec(step);
    database.pragma(`user_version = ${steps.length}`);
  })();
}

/** Empty pages within a file, which are written to before it grows [bytes]. */
export function emptyBytes(database: Database): number {
  const [pages, bytes] = ['freelist_count', 'page_size'].map((name) =>
    Number(database.pragma(name, { simple: true })),
  );
  return pages! * bytes!;
}

const ADVICE: Readonly<Record<string, string>> = {
  SQLITE_ERROR:
    'The file is not as this rockhour makes it: it may be of a build in between. Set another store.folder.',
  SQLITE_FULL: 'The disk is full: make room. Readings wait at the broker until there is some.',
  SQLITE_CORRUPT:
    'The file is damaged: the next start of the daemon sets it aside and takes over what can be read.',
  SQLITE_NOTADB: 'The file is no database of rockhour: set another store.folder.',
  SQLITE_READONLY: 'The file or its folder may not be written: check owner and permissions.',
  SQLITE_BUSY: 'Another process holds the file: only one rockhour may use a store.folder.',
  SQLITE_CANTOPEN: 'Check that store.folder exists and that its owner may write to it.',
};

/** Whether SQLite itself has failed. */
export function isStoreFault(thrown: unknown): boolean {
  return codeOf(thrown).startsWith('SQLITE');
}

/** What SQLite said, as an error of the catalogue. */
export function storeFailure(what: string, thrown: unknown): RockhourError {
  if (thrown instanceof RockhourError) return thrown;
  const code = codeOf(thrown);
  const known = Object.keys(ADVICE).find((name) => code.startsWith(name));
  return new RockhourError(
    'STORE_FAILED',
    `${what}: ${fileReasonOf(thrown)}${code && ` (${code})`}`,
    {
      cause: thrown,
      ...(known === undefined ? {} : { advice: ADVICE[known]! }),
    },
  );
}

function codeOf(thrown: unknown): string {
  if (typeof thrown !== 'object' || thrown === null || !('code' in thrown)) return '';
  return typeof thrown.code === 'string' ? thrown.code : '';
}
