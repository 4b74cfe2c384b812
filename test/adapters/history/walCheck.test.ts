import { copyFileSync, readFileSync, statSync, truncateSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { Journal } from '../../../src/adapters/history/journal.js';
import type { SetAside } from '../../../src/adapters/history/setAside.js';
import { commitsBehindBreak } from '../../../src/adapters/history/walCheck.js';
import { temporaryFolder } from '../../support/folders.js';
import { mulberry } from '../../support/random.js';

const COMMITS = 40;
const reading = (n: number) =>
  ({ unit: 'u', channel: 'a', time_ms: n, arrival_ms: n, value: n, quality: 'good' }) as const;

/** A journal as a killed daemon leaves it: all of its commits in the write-ahead log. */
function killed(folder: string): string {
  const file = join(folder, 'journal.sqlite');
  const journal = new Journal(join(folder, 'live.sqlite'));
  journal.start();
  for (let n = 1; n <= COMMITS; n++) journal.append([reading(n)]);
  for (const end of ['', '-wal']) copyFileSync(join(folder, `live.sqlite${end}`), file + end);
  journal.stop();
  return file;
}

describe('a write-ahead log', () => {
  it('that ends anywhere is sound: so a kill leaves it', () => {
    const file = killed(temporaryFolder('wal'));
    const wal = `${file}-wal`;
    expect(commitsBehindBreak(wal)).toBe(0);
    for (let size = statSync(wal).size - 1; size > 0; size = Math.floor(size * 0.97) - 1) {
      truncateSync(wal, size);
      expect(commitsBehindBreak(wal)).toBe(0);
    }
    expect(commitsBehindBreak(`${file}-none`)).toBe(0);
  });

  it('that begins anew before those of before is sound', () => {
    const file = join(temporaryFolder('wal'), 'journal.sqlite');
    const journal = new Journal(file);
    journal.start();
    // Worked in at every 1000 pages, and then written from its beginning.
    for (let n = 1; n <= 1500; n++) {
      journal.append([reading(n)]);
      if (n % 50 === 0) expect(commitsBehindBreak(`${file}-wal`)).toBe(0);
    }
    journal.stop();
  });

  it('with a byte changed is broken there, and the journal is set aside with what is ahead of it', () => {
    const random = mulberry(5);
    for (let round = 0; round < 12; round++) {
      const file = killed(temporaryFolder('wal'));
      const bytes = readFileSync(`${file}-wal`);
      // Within the first half: commits are behind it.
      const at = Math.floor((random() * bytes.length) / 2);
      bytes[at]! ^= 1 << Math.floor(random() * 8);
      writeFileSync(`${file}-wal`, bytes);
      expect(commitsBehindBreak(`${file}-wal`)).toBeGreaterThan(1);
      const told: SetAside[] = [];
      const journal = new Journal(
        file,
        () => 0,
        (what) => told.push(what),
      );
      journal.start();
      const values = journal
        .read(0, 1000)
        .flatMap((one) => (one.kind === 'reading' ? [one.value] : []));
      expect(told.map(({ reason }) => reason)).toEqual([
        expect.stringMatching(/^its write-ahead log is broken: /),
      ]);
      expect(values).toEqual(Array.from({ length: values.length }, (_, n) => n + 1));
      expect(values.length).toBeLessThan(COMMITS);
      journal.stop();
    }
  });
});

it('a journal that ends before what was worked off goes on behind it, and tells what is lost', () => {
  const folder = temporaryFolder('wal');
  const file = killed(folder);
  truncateSync(`${file}-wal`, Math.floor(statSync(`${file}-wal`).size / 2));
  const told: SetAside[] = [];
  const journal = new Journal(
    file,
    () => COMMITS,
    (what) => told.push(what),
  );
  journal.start();
  const there = journal.read(0, 1000).filter(({ kind }) => kind === 'reading').length;
  expect(there).toBeGreaterThan(5);
  expect(told).toEqual([
    expect.objectContaining({
      reason: `it ends with entry ${there}, where ${COMMITS} had been worked off`,
      lost: COMMITS - there,
    }),
  ]);
  // A number given once more would be taken for worked off, and never be.
  expect(journal.append([reading(99)])).toBeGreaterThan(COMMITS);
  journal.stop();
});
