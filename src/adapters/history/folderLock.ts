import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { RockhourError } from '../../errors.js';
import { type Database, makeFolder, storeFailure } from './database.js';
import { trustFolder } from './folderTrust.js';

/**
 * Keeps a second rockhour out of a folder: two would write the same journal twice. Held by a lock
 * of the operating system, which goes with the process, however that ends.
 */
export class FolderLock {
  private database: Database | null = null;

  constructor(private readonly folder: string) {}

  /** @throws RockhourError STORE_FAILED where another process holds it or the folder cannot be had */
  start(): void {
    if (this.database) return;
    let database: Database | null = null;
    try {
      makeFolder(this.folder);
      trustFolder(this.folder);
      database = new SQLite(join(this.folder, 'lock.sqlite'), { timeout: 0 });
      database.exec('BEGIN EXCLUSIVE');
    } catch (thrown) {
      database?.close();
      throw lockFailure(this.folder, thrown);
    }
    this.database = database;
  }

  stop(): void {
    this.database?.close();
    this.database = null;
  }
}

function lockFailure(folder: string, thrown: unknown): RockhourError {
  if (thrown instanceof SQLite.SqliteError && thrown.code.startsWith('SQLITE_BUSY')) {
    return new RockhourError('STORE_FAILED', `another rockhour uses the folder ${folder}`, {
      cause: thrown,
      advice: 'Stop it, or set another store.folder: two would write the same journal.',
    });
  }
  return storeFailure(`opening the folder ${folder}`, thrown);
}
