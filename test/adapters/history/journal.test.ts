import { appendFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { expect, it } from 'vitest';
import { Journal, type JournalReading } from '../../../src/adapters/history/journal.js';
import { RockhourError } from '../../../src/errors.js';
import { temporaryFolder } from '../../support/folders.js';

const file = () => join(temporaryFolder('journal'), 'journal.sqlite');

function reading(channel: string, time_ms: number, value: number): JournalReading {
  return { unit: 'u', channel, time_ms, arrival_ms: time_ms + 7, value, quality: 'good' };
}

function opened(path: string): Journal {
  const journal = new Journal(path);
  journal.start();
  return journal;
}

function thrownBy(action: () => unknown): RockhourError {
  try {
    action();
  } catch (thrown) {
    if (thrown instanceof RockhourError) return thrown;
    throw thrown;
  }
  throw new Error('nothing was thrown');
}

it('gives back what was written, in the order of arrival, to the last bit', () => {
  const journal = opened(file());
  const values = [0.1 + 0.2, Number.NaN, 5e-324, -1.7976931348623157e308, 3];
  const readings = values.map((value, i) => reading(`c${i % 2}`, 1000 - i, value));
  expect(journal.append(readings)).toBe(5);
  expect(journal.appendClose('u', -12, 99)).toBe(6);
  const entries = journal.read(0, 100);
  expect(entries.slice(0, 5)).toEqual(
    readings.map((r, i) => ({ kind: 'reading', seq: i + 1, ...r })),
  );
  expect(entries[5]).toEqual({ kind: 'close', seq: 6, unit: 'u', scan_index: -12, arrival_ms: 99 });
  expect(journal.read(4, 1)).toEqual([entries[4]]);
  journal.stop();
  journal.stop();
});

it('goes on where it ended, with the numbers of its channels, after it was closed', () => {
  const path = file();
  const before = opened(path);
  before.append([reading('a', 1, 1), reading('b', 2, 2)]);
  before.stop();
  const after = opened(path);
  expect(after.lastSeq).toBe(2);
  after.append([reading('b', 3, 3), reading('c', 4, 4)]);
  expect(after.read(0, 10).map((e) => (e.kind === 'reading' ? e.channel : null))).toEqual([
    ...['a', 'b', 'b', 'c'],
  ]);
  after.stop();
});

it('never uses a number twice, even after everything but the newest entry was deleted', () => {
  const path = file();
  const journal = opened(path);
  journal.append([1, 2, 3].map((t) => reading('a', t, t)));
  expect(journal.forget(3)).toBe(2);
  journal.stop();
  const after = opened(path);
  expect(after.append([reading('a', 4, 4)])).toBe(4);
  after.stop();
});

it('finds the last entry before a time of arrival', () => {
  const journal = opened(file());
  expect(journal.seqBefore(5)).toBe(0);
  journal.append([10, 20, 30, 40].map((t) => reading('a', t - 7, t)));
  expect([5, 10, 11, 30, 31, 99].map((t) => journal.seqBefore(t))).toEqual([0, 0, 1, 2, 3, 4]);
  journal.forget(2);
  expect([5, 31].map((t) => journal.seqBefore(t))).toEqual([2, 3]);
  journal.stop();
});

it('is not misled by what came while the clock had lost its date', () => {
  const journal = opened(file());
  const T = Date.UTC(2026, 0, 1);
  const came = [T, T + 10, T + 20, 1000, 1010, 1020, 1030, T + 30, T + 40, T + 50];
  journal.append(came.map((t) => reading('a', t - 7, 1)));
  expect([T, T + 11, T + 40].map((t) => journal.seqBefore(t))).toEqual([0, 2, 8]);
  journal.stop();
});

it('has what it wrote before a failure, and writes on after it, with a new channel as well', () => {
  const path = file();
  const journal = opened(path);
  journal.append([reading('a', 1, 1)]);
  const other = new SQLite(path);
  other.exec('BEGIN IMMEDIATE');
  const error = thrownBy(() => journal.append([reading('new', 2, 2)]));
  expect(error.code).toBe('STORE_FAILED');
  expect(error.message).toContain('SQLITE_BUSY');
  expect(error.advice).toContain('Another process holds the file');
  other.exec('ROLLBACK');
  other.close();
  expect(journal.append([reading('new', 2, 2)])).toBe(2);
  expect(journal.read(1, 9)).toMatchObject([{ channel: 'new', seq: 2 }]);
  journal.stop();
}, 10_000);

it('says in one sentence that a disk is full, and takes nothing of the batch', () => {
  const path = file();
  const journal = opened(path);
  journal.append([reading('a', 1, 1)]);
  // What a full disk looks like to SQLite: no further page may be had.
  const database = (journal as unknown as { database: SQLite.Database }).database;
  database.pragma(`max_page_count = ${database.pragma('page_count', { simple: true })}`);
  const many = Array.from({ length: 5000 }, (_, i) => reading('a', i, i));
  const error = thrownBy(() => journal.append(many));
  expect(error.message).toContain('SQLITE_FULL');
  expect(error.advice).toContain('disk is full');
  expect(journal.lastSeq).toBe(1);
  database.pragma('max_page_count = 1000000');
  expect(journal.append(many)).toBe(5001);
  journal.stop();
});

it('says that a file is damaged, foreign or newer instead of writing to it', () => {
  const foreign = file();
  writeFileSync(foreign, 'this is a letter, not a database\n'.repeat(100));
  expect(thrownBy(() => opened(foreign)).advice).toContain('no database of rockhour');

  const damaged = file();
  const whole = opened(damaged);
  whole.append(Array.from({ length: 20_000 }, (_, i) => reading('a', i, i)));
  whole.stop();
  const bytes = Buffer.alloc(200_000, 0x5a);
  const handle = new SQLite(damaged);
  const page = Number(handle.pragma('page_size', { simple: true }));
  handle.close();
  writeFileSync(damaged, bytes, { flag: 'r+' });
  appendFileSync(damaged, Buffer.alloc(page));
  expect(thrownBy(() => opened(damaged)).code).toBe('STORE_FAILED');

  const newer = file();
  const made = new SQLite(newer);
  made.pragma('user_version = 99');
  made.close();
  expect(thrownBy(() => opened(newer)).message).toContain('written by a newer rockhour');
});

it('says that a folder cannot be had', () => {
  const folder = temporaryFolder('journal');
  writeFileSync(join(folder, 'file'), '');
  const error = thrownBy(() => opened(join(folder, 'file', 'journal.sqlite')));
  expect(error.code).toBe('STORE_FAILED');
  expect(error.message).toContain('journal.sqlite');
});
