import type { Database } from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { fastClock } from '../../src/daemon/clock.js';
import type { Daemon } from '../../src/daemon.js';
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

/** SQLite's own limit stands for the end of the disk: a way that works on every machine. */
function limitPages(daemon: Daemon, file: 'journal' | 'history', most: number | null): void {
  const parts = daemon as unknown as {
    journal: { database: Database };
    history: { opened: { database: Database } };
  };
  const database = file === 'journal' ? parts.journal.database : parts.history.opened.database;
  const pages = Number(database.pragma('page_count', { simple: true }));
  database.pragma(`max_page_count = ${most === null ? 1_000_000 : pages + most}`);
}

const isRaised = (daemon: Daemon) =>
  daemon.service.standing().some(({ id, state }) => {
    return id === 'u/disk_full/disk' && state === 'unacknowledged';
  });

describe('a full disk', () => {
  it('stops acknowledging, is told, and loses nothing once there is room', async () => {
    const site = smallSite(null);
    const daemon = makeDaemon(site, { clock: fastClock(Date.now(), 50) });
    const { broker } = await daemon.start();
    const client = await publisher(broker);
    await publishScan(client, START, [0, 0, 0, 0]);
    await expect.poll(() => count(daemon, 'readings')).toBe(4);
    limitPages(daemon, 'journal', 0);
    const sent: Promise<unknown>[] = [];
    // More than a page holds.
    for (let n = 1; n < 60; n++) {
      sent.push(publishScan(client, START + n * PERIOD_MS, [n, n, n, n]));
    }
    await expect.poll(() => count(daemon, 'journal_failures')).toBeGreaterThan(0);
    await expect.poll(() => isRaised(daemon)).toBe(true);
    expect(daemon.service.health().find(({ name }) => name === 'store')!.ok).toBe(false);
    limitPages(daemon, 'journal', null);
    await expect.poll(() => count(daemon, 'readings'), { timeout: 10_000 }).toBe(240);
    await Promise.all(sent);
    await expect.poll(() => isRaised(daemon)).toBe(false);
    await daemon.stop();
    const values = storedEntries(site).filter(({ kind }) => kind === 'reading');
    expect(values).toHaveLength(240);
  });

  it('of the history keeps estimates in memory, then in the journal, and stores each of them', async () => {
    const site = smallSite(null);
    const start = START - 700 * PERIOD_MS;
    const daemon = makeDaemon(site, { clock: fastClock(Date.now(), 50) });
    const { broker } = await daemon.start();
    const client = await publisher(broker);
    await publishScan(client, start, [0, 0, 0, 0]);
    await expect.poll(() => count(daemon, 'readings')).toBe(4);
    limitPages(daemon, 'history', 0);
    for (let n = 1; n <= 700; n++) {
      await publishScan(client, start + n * PERIOD_MS, [n, n, n, n]);
    }
    await expect.poll(() => count(daemon, 'history_failures')).toBeGreaterThan(0);
    await expect.poll(() => daemon.service.health()[1]!.ok).toBe(false);
    limitPages(daemon, 'history', null);
    await expect
      .poll(() => count(daemon, 'scans'), { timeout: 15_000 })
      .toBeGreaterThanOrEqual(700);
    await daemon.stop();
    const times = storedEstimates(site).map(({ time }) => Date.parse(time));
    const wanted = Array.from({ length: 700 }, (_, n) => start + n * PERIOD_MS);
    expect(times.slice(0, 700)).toEqual(wanted);
  });

  it('is thinned for before it is full, and what is not forwarded or not replayed stays', async () => {
    // No disk has so much room: all that may go goes.
    const made = smallSite(null);
    const site = { ...made, store: { ...made.store, keep_free_MB: 10_000_000 } };
    const first = makeDaemon(made);
    const { broker } = await first.start();
    const client = await publisher(broker);
    const old = START - 3 * 86_400_000;
    for (let n = 0; n < 60; n++) await publishScan(client, old + n * PERIOD_MS, [n, n, n, n]);
    await expect.poll(() => count(first, 'scans')).toBeGreaterThanOrEqual(59);
    // Ages are held against the newest reading.
    await publishScan(client, START, [0, 0, 0, 0]);
    await expect.poll(() => count(first, 'readings')).toBe(244);
    await first.stop();
    const before = storedEstimates(made).length;
    const daemon = makeDaemon(site, { clock: fastClock(Date.now(), 50) });
    await daemon.start();
    await expect.poll(() => count(daemon, 'rows_thinned_early')).toBeGreaterThan(0);
    await expect.poll(() => isRaised(daemon)).toBe(true);
    await daemon.stop();
    expect(storedEstimates(made).length).toBeLessThan(before);
    // Readings arrived just now: late ones may go back to them.
    expect(storedEntries(made).filter(({ kind }) => kind === 'reading')).toHaveLength(244);
  });
});
