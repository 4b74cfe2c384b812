import { existsSync, renameSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { RockhourError } from '../../errors.js';
import { makeFolder, storeFailure } from './database.js';

/**
 * In this order: whatever the history has taken in of the journal is in the copy of the journal, which
 * is made after it.
 */
const FILES = ['history.sqlite', 'journal.sqlite'] as const;

/**
 * Copies history and journal into a folder, each as it is at one moment, beside a daemon that writes to
 * them; each comes under its name only when it is whole and was found sound.
 *
 * @returns the files, with their sizes [bytes]
 * @throws RockhourError STORE_FAILED; OUTPUT_UNWRITABLE where the folder has such files already
 */
export async function copyStore(
  folder: string,
  out: string,
): Promise<{ file: string; bytes: number }[]> {
  const there = FILES.find((name) => existsSync(join(out, name)));
  if (there !== undefined) {
    throw new RockhourError('OUTPUT_UNWRITABLE', `${join(out, there)} exists already`, {
      advice: 'Name a folder without a backup: none is overwritten.',
    });
  }
  const copied: { file: string; bytes: number }[] = [];
  for (const name of FILES) copied.push(await copyOne(join(folder, name), join(out, name), out));
  return copied;
}

async function copyOne(from: string, to: string, out: string) {
  const half = `${to}.part`;
  let source: SQLite.Database | null = null;
  let copy: SQLite.Database | null = null;
  try {
    source = new SQLite(from, { readonly: true, fileMustExist: true, timeout: 10_000 });
    makeFolder(out);
    // Made anew: a link that somebody put there is not followed.
    rmSync(half, { force: true });
    writeFileSync(half, '', { mode: 0o600, flag: 'wx' });
    // All at once, from one moment: with pages in turn every write of the daemon begins it again.
    await source.backup(half, { progress: () => 0x7fffffff });
    copy = new SQLite(half);
    copy.pragma('journal_mode = DELETE');
    const found = String(copy.pragma('quick_check(1)', { simple: true }));
    if (found !== 'ok') throw new Error(`the copy is not sound: ${found}`);
    const [pages, size] = ['page_count', 'page_size'].map((one) =>
      Number(copy?.pragma(one, { simple: true })),
    ) as [number, number];
    copy.close();
    copy = null;
    renameSync(half, to);
    return { file: to, bytes: pages * size };
  } catch (thrown) {
    throw storeFailure(`copying ${from} to ${to}`, thrown);
  } finally {
    copy?.close();
    source?.close();
    rmSync(half, { force: true });
  }
}
