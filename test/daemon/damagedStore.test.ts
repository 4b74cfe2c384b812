import { closeSync, existsSync, openSync, readdirSync, statSync, writeSync } from 'node:fs';
import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { Journal, type JournalReading } from '../../src/adapters/history/journal.js';
import { temporaryFolder } from '../support/folders.js';
import { runs } from '../support/runs.js';
import {
  count,
  makeDaemon,
  publisher,
  publishScan,
  storedEntries,
  storedEstimates,
} from './harness.js';
import { PERIOD_MS, smallSite } from './site.js';

const START = Math.floor((Date.now() - 3_600_000) / PERIOD_MS) * PERIOD_MS;

function reading(n: number): JournalReading {
  return { unit: 'u', channel: 'a', time_ms: n, arrival_ms: n, value: n, quality: 'good' };
}

/** Overwrites bytes at a share of the file's length. */
function overwrite(file: string, share: number, bytes: Buffer): void {
  const handle = openSync(file, 'r+');
  writeSync(handle, bytes, 0, bytes.length, Math.floor(share * (statSync(file).size - 1)));
  closeSync(handle);
}

const aside = (folder: string) => readdirSync(folder).filter((name) => name.includes('.damaged-'));

describe('a damaged journal', () => {
  it('never gives a number twice, whatever bytes of it are overwritten', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 0, max: 1, noNaN: true }),
        fc.uint8Array({ minLength: 1, maxLength: 9000 }),
        (share, bytes) => {
          const file = join(temporaryFolder('damaged'), 'journal.sqlite');
          const first = new Journal(file);
          first.start();
          first.append(Array.from({ length: 3000 }, (_, n) => reading(n + 1)));
          first.stop();
          overwrite(file, share, Buffer.from(bytes));
          const told: string[] = [];
          // Something else remembers that 2900 had been taken in.
          const next = new Journal(
            file,
            () => 2900,
            ({ kept }) => told.push(kept),
          );
          next.start();
          const old = next.read(0, 10_000);
          const before = next.lastSeq;
          const seq = next.append([reading(5000)]);
          // Where nothing showed the damage the number is the next; else behind what was left out.
          expect(seq).toBe(before + 1);
          expect(seq).toBeGreaterThan(told.length > 0 ? 2900 : 3000 - 1);
          const seqs = old.map((one) => one.seq);
          expect(new Set(seqs).size).toBe(seqs.length);
          expect(next.read(seq - 1, 10).map((one) => one.seq)).toEqual([seq]);
          for (const kept of told) expect(existsSync(kept)).toBe(true);
          next.stop();
        },
      ),
      { numRuns: runs(25), seed: 7 },
    );
  });

  it('is set aside while it is read and written, with all that its sound pages hold', () => {
    const file = join(temporaryFolder('damaged'), 'journal.sqlite');
    const told: { kept: string; rows: number }[] = [];
    const journal = new Journal(
      file,
      () => 0,
      (what) => told.push(what),
    );
    journal.start();
    journal.append(Array.from({ length: 5000 }, (_, n) => reading(n + 1)));
    journal.stop();
    journal.start();
    const size = statSync(file).size;
    overwrite(file, 0.5, Buffer.alloc(8192, 0xff));
    const entries = journal.read(0, 10_000).filter((one) => one.kind === 'reading');
    expect(told).toHaveLength(1);
    // At most the pieces that touch three damaged pages are missing.
    const perPage = 5000 / (size / 4096);
    expect(entries.length).toBeGreaterThan(5000 - 3 * perPage - 3 * 256);
    expect(entries.length).toBeLessThan(5000);
    const seq = journal.append([reading(9000)]);
    expect(seq).toBeGreaterThan(5001);
    // Behind the numbers left out, but before their mark, which has the time of this machine.
    expect(journal.seqBefore(8999)).toBe(seq - 2);
    expect(journal.forget(seq, 100)).toBe(100);
    journal.stop();
  });
});

describe('a daemon with a damaged store', () => {
  it('sets the history aside, tells it, and makes the estimates again from the journal', async () => {
    const site = smallSite(null);
    const { folder } = site.store;
    const first = makeDaemon(site);
    const { broker } = await first.start();
    const client = await publisher(broker);
    for (let n = 0; n < 20; n++) await publishScan(client, START + n * PERIOD_MS, [n, n, n, n]);
    await expect.poll(() => count(first, 'scans')).toBeGreaterThanOrEqual(19);
    await first.stop();
    const before = storedEstimates(site);
    overwrite(join(folder, 'history.sqlite'), 0, Buffer.alloc(100, 0x21));
    const second = makeDaemon(site);
    await second.start();
    expect(count(second, 'stores_set_aside')).toBe(1);
    expect(second.service.standing().map(({ id }) => id)).toContain('u/store_damaged/history');
    await second.stop();
    expect(aside(folder).length).toBeGreaterThan(0);
    // To the last bit: the journal alone makes them.
    expect(storedEstimates(site)).toEqual(before);
  });

  it('goes on with a fresh history when the one in use turns out damaged', async () => {
    const site = smallSite(null);
    const { folder } = site.store;
    const daemon = makeDaemon(site);
    const { broker } = await daemon.start();
    const client = await publisher(broker);
    for (let n = 0; n < 5; n++) await publishScan(client, START + n * PERIOD_MS, [n, n, n, n]);
    await expect.poll(() => count(daemon, 'scans')).toBeGreaterThanOrEqual(4);
    // The write-ahead log is worked in, then every page but the first is overwritten.
    const file = join(folder, 'history.sqlite');
    const other = new SQLite(file);
    other.pragma('wal_checkpoint(TRUNCATE)');
    other.close();
    const handle = openSync(file, 'r+');
    const { size } = statSync(file);
    writeSync(handle, Buffer.alloc(size - 4096, 0xee), 0, size - 4096, 4096);
    closeSync(handle);
    for (let n = 5; n < 12; n++) await publishScan(client, START + n * PERIOD_MS, [n, n, n, n]);
    await expect.poll(() => count(daemon, 'stores_set_aside')).toBe(1);
    await expect.poll(() => count(daemon, 'scans')).toBeGreaterThanOrEqual(11);
    await daemon.stop();
    expect(storedEntries(site).filter(({ kind }) => kind === 'reading')).toHaveLength(12 * 4);
    expect(storedEstimates(site).length).toBeGreaterThanOrEqual(6);
  });
});
