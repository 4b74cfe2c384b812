import { existsSync, readdirSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { expect, it } from 'vitest';
import { copyStore } from '../../../src/adapters/history/copyStore.js';
import { History } from '../../../src/adapters/history/history.js';
import { Journal } from '../../../src/adapters/history/journal.js';
import { Rig, reading } from '../../daemon/rewind/rig.js';
import { PERIOD_MS, smallSite } from '../../daemon/site.js';
import { temporaryFolder } from '../../support/folders.js';

const START = Date.UTC(2026, 0, 5, 6);
const scan = (i: number) =>
  ['a', 'b', 'c'].map((channel, n) => reading(channel, START + i * PERIOD_MS + n, i + n));

it('a copy of the store is made beside a daemon that writes, and a daemon goes on from it', async () => {
  const rig = await new Rig().start();
  for (let i = 0; i < 60; i++) await rig.take(scan(i));
  const out = join(temporaryFolder('copy'), 'below');
  let copied = false;
  const copying = copyStore(rig.folder, out).then((files) => {
    copied = true;
    return files;
  });
  let taken = 60;
  while (!copied) await rig.take(scan(taken++));
  const files = await copying;
  expect(files.map(({ file }) => file)).toEqual(
    ['history.sqlite', 'journal.sqlite'].map((name) => join(out, name)),
  );
  expect(files.every(({ bytes }) => bytes > 4096)).toBe(true);
  expect(readdirSync(out).sort()).toEqual(['history.sqlite', 'journal.sqlite']);
  const { entries, estimates } = contentOf(out);
  // The journal's moment is the later one: nothing of the history lacks its readings.
  expect(entries).toBeGreaterThanOrEqual(3 * estimates);
  expect(estimates).toBeGreaterThanOrEqual(59);
  const second = await new Rig({ folder: out }).start();
  const through = second.estimates();
  await second.take(scan(taken));
  expect(through).toEqual(rig.estimates().slice(0, through.length));
  expect(second.estimates().length).toBe(through.length + 1);
  second.stop();
  rig.stop();
  // None is written over.
  await expect(copyStore(rig.folder, out)).rejects.toMatchObject({ code: 'OUTPUT_UNWRITABLE' });
});

function contentOf(folder: string) {
  const journal = new Journal(join(folder, 'journal.sqlite'));
  const history = new History(join(folder, 'history.sqlite'), smallSite(null).store);
  journal.start();
  history.start();
  const entries = journal.read(0, 1e6).length;
  const estimates = history.estimates.between('u', 0, 8.64e15, 1e6).length;
  journal.stop();
  history.stop();
  return { entries, estimates };
}

it('a store that is none, or damaged, is told in words and leaves nothing behind', async () => {
  const folder = temporaryFolder('copy');
  const out = join(folder, 'out');
  await expect(copyStore(folder, out)).rejects.toMatchObject({ code: 'STORE_FAILED' });
  writeFileSync(join(folder, 'history.sqlite'), 'x'.repeat(10_000));
  await expect(copyStore(folder, out)).rejects.toMatchObject({ code: 'STORE_FAILED' });
  expect(existsSync(join(out, 'history.sqlite'))).toBe(false);
  expect(existsSync(join(out, 'history.sqlite.part'))).toBe(false);
});
