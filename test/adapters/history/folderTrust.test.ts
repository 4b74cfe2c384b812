import {
  chmodSync,
  existsSync,
  lchownSync,
  lstatSync,
  mkdirSync,
  readdirSync,
  readFileSync,
  readlinkSync,
  symlinkSync,
  writeFileSync,
} from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { copyStore } from '../../../src/adapters/history/copyStore.js';
import { openDatabase } from '../../../src/adapters/history/database.js';
import { FolderLock } from '../../../src/adapters/history/folderLock.js';
import { History } from '../../../src/adapters/history/history.js';
import { Journal } from '../../../src/adapters/history/journal.js';
import { moveAside } from '../../../src/adapters/history/setAside.js';
import { writeWhole } from '../../../src/commands/backup.js';
import { smallSite } from '../../daemon/site.js';
import { temporaryFolder } from '../../support/folders.js';

const SOMEBODY = 54_321;
const isRoot = process.getuid?.() === 0;

/** A folder for the store, and a file of rockhour's user beside it that nobody else may change. */
function places() {
  const around = temporaryFolder('links');
  const folder = join(around, 'data');
  mkdirSync(folder);
  const victim = join(around, 'victim');
  writeFileSync(victim, 'as it was');
  return { folder, victim, isAsItWas: () => readFileSync(victim, 'utf8') === 'as it was' };
}

describe('the folder of the store', () => {
  it('is refused where every user may write, before anything is made in it', () => {
    const { folder } = places();
    chmodSync(folder, 0o777);
    expect(() => new FolderLock(folder).start()).toThrow(
      /every user may write to the folder .*data/,
    );
    expect(readdirSync(folder)).toEqual([]);
    chmodSync(folder, 0o770);
    const lock = new FolderLock(folder);
    lock.start();
    lock.stop();
  });

  it.skipIf(!isRoot)(
    'is refused with a link of another account, and taken with the owner’s',
    () => {
      const { folder, victim, isAsItWas } = places();
      const link = join(folder, 'history.sqlite-wal');
      symlinkSync(victim, link);
      lchownSync(link, SOMEBODY, SOMEBODY);
      expect(() => new FolderLock(folder).start()).toThrow(
        `${link} is a link that user ${SOMEBODY} made, who does not own the folder`,
      );
      expect(readdirSync(folder)).toEqual(['history.sqlite-wal']);
      expect(isAsItWas()).toBe(true);
      lchownSync(link, 0, 0);
      const lock = new FolderLock(folder);
      lock.start();
      lock.stop();
    },
  );

  it('as a link itself is followed: a disk of its own may be meant', () => {
    const { folder } = places();
    const link = `${folder}-link`;
    symlinkSync(folder, link);
    const lock = new FolderLock(link);
    lock.start();
    expect(readdirSync(folder)).toContain('lock.sqlite');
    lock.stop();
  });
});

describe('a link in the way is put away and not followed', () => {
  it('at the name of what is set aside', () => {
    const { folder, victim, isAsItWas } = places();
    const file = join(folder, 'journal.sqlite');
    openDatabase(file, 'normal', ['CREATE TABLE one (no INTEGER)']).close();
    const now = new Date(0);
    // One that leads nowhere looks as if there were no such file.
    const name = `${file}.damaged-1970-01-01T00-00-00-000Z`;
    symlinkSync(`${victim}-none`, name);
    symlinkSync(victim, `${name}-wal`);
    writeFileSync(`${file}-wal`, 'log');
    const kept = moveAside(file, now);
    expect([lstatSync(kept).isFile(), existsSync(`${victim}-none`), isAsItWas()]).toEqual([
      ...[true, false, true],
    ]);
    expect(readFileSync(`${kept}-wal`, 'utf8')).toBe('log');
  });

  it('at the name of a half copy of the store', async () => {
    const { folder, victim, isAsItWas } = places();
    const [history, journal] = [
      new History(join(folder, 'history.sqlite'), smallSite(null).store),
      new Journal(join(folder, 'journal.sqlite')),
    ];
    for (const one of [history, journal]) {
      one.start();
      one.stop();
    }
    const out = join(folder, 'copy');
    mkdirSync(out);
    for (const name of ['history.sqlite.part', 'journal.sqlite'])
      symlinkSync(victim, join(out, name));
    // What has the name of a copy is not written over, link or not.
    await expect(copyStore(folder, out)).rejects.toMatchObject({ code: 'OUTPUT_UNWRITABLE' });
    const other = join(folder, 'other');
    mkdirSync(other);
    symlinkSync(victim, join(other, 'history.sqlite.part'));
    await copyStore(folder, other);
    expect(readdirSync(other).sort()).toEqual(['history.sqlite', 'journal.sqlite']);
    expect(lstatSync(join(other, 'history.sqlite')).isFile()).toBe(true);
    expect(isAsItWas()).toBe(true);
  });

  it("at the name of a unit's backup, whole or half", () => {
    const { folder, victim, isAsItWas } = places();
    const file = join(folder, 'unit.backup');
    symlinkSync(victim, `${file}.part`);
    symlinkSync(victim, file);
    expect(readlinkSync(file)).toBe(victim);
    writeWhole(file, Buffer.from('state'));
    expect([readFileSync(file, 'utf8'), lstatSync(file).isFile()]).toEqual(['state', true]);
    expect(isAsItWas()).toBe(true);
  });
});
