import { lstatSync, readdirSync, statSync } from 'node:fs';
import { join } from 'node:path';
import { RockhourError } from '../../errors.js';

/** POSIX: every user may write. */
const WRITABLE_BY_ALL = 0o002;
const ROOT = 0;

/**
 * Refuses a folder where an account that is not trusted can decide what is written and where. Trusted are
 * its owner, its group, the user that rockhour runs as, and root: a link of theirs is followed, as the
 * folder itself may be one. Whoever else may write there could put a link to any file of rockhour's user.
 *
 * @throws RockhourError STORE_FAILED where every user may write there, or an entry is another's link
 */
export function trustFolder(folder: string, user = process.getuid?.()): void {
  // Windows has no such owners.
  if (user === undefined) return;
  const { mode, uid: owner } = statSync(folder);
  if ((mode & WRITABLE_BY_ALL) !== 0) {
    throw new RockhourError('STORE_FAILED', `every user may write to the folder ${folder}`, {
      advice: `They could put links there to files of others: chmod o-w ${folder}`,
    });
  }
  for (const name of readdirSync(folder)) {
    const path = join(folder, name);
    const entry = lstatSync(path, { throwIfNoEntry: false });
    if (!entry?.isSymbolicLink() || [owner, user, ROOT].includes(entry.uid)) continue;
    throw new RockhourError(
      'STORE_FAILED',
      `${path} is a link that user ${entry.uid} made, who does not own the folder`,
      { advice: 'Look where it leads and remove it, or make it anew as the owner of the folder.' },
    );
  }
}
