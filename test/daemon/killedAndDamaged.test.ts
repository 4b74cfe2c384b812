import {
  closeSync,
  existsSync,
  openSync,
  readdirSync,
  statSync,
  truncateSync,
  writeSync,
} from 'node:fs';
import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { Journal } from '../../src/adapters/history/journal.js';
import { loadSite } from '../../src/config/load.js';
import { requireProgram } from '../support/requirements.js';
import { startMosquitto } from '../support/services.js';
import { waitFor } from '../support/wait.js';
import { later, publisher } from './harness.js';
import { RockhourProcess } from './processes.js';
import { siteFile } from './siteFile.js';

const mosquitto = requireProgram('mosquitto');
const PAGE = 4096;
/** Source time between two readings. */
const STEP_MS = 2500;

/** The newest value in the journal of a daemon that may be running. */
function newest(folder: string): number {
  const database = new SQLite(join(folder, 'journal.sqlite'), { readonly: true });
  try {
    const found = database.prepare('SELECT max(value) FROM entries WHERE quality < 9').pluck();
    return (found.get() as number | null) ?? -1;
  } finally {
    database.close();
  }
}

/** How far the newest saved state has worked the journal off; 0 before the first. */
function workedOff(folder: string): number {
  const database = new SQLite(join(folder, 'history.sqlite'), { readonly: true });
  try {
    const found = database.prepare('SELECT max(journal_seq) FROM checkpoints').pluck();
    return (found.get() as number | null) ?? 0;
  } finally {
    database.close();
  }
}

function storedValues(folder: string): number[] {
  const journal = new Journal(join(folder, 'journal.sqlite'));
  journal.start();
  const found = journal.read(0, 1e6).flatMap((one) => (one.kind === 'reading' ? [one.value] : []));
  journal.stop();
  return found;
}

/** Garbage over the middle pages of a file, in its write-ahead log too: no page is had from there. */
function overwriteMiddle(file: string, share: number): void {
  for (const one of [file, `${file}-wal`]) {
    if (!existsSync(one)) continue;
    const { size } = statSync(one);
    const pages = Math.floor((size / PAGE) * share);
    if (pages === 0) continue;
    const from = Math.floor((size / PAGE - pages) / 2) * PAGE;
    const handle = openSync(one, 'r+');
    writeSync(handle, Buffer.alloc(pages * PAGE, 0xa5), 0, pages * PAGE, from);
    closeSync(handle);
  }
}

/** What is done to the folder, and what the journal is found to be. */
const DAMAGE: readonly [string, (folder: string) => void, RegExp][] = [
  [
    'the middle of both files overwritten',
    (folder) => {
      for (const name of ['journal', 'history'])
        overwriteMiddle(join(folder, `${name}.sqlite`), 0.3);
    },
    /journal\.sqlite was damaged: its write-ahead log is broken: \d+ commits or more in it cannot/,
  ],
  [
    "the journal's write-ahead log cut off",
    (folder) => truncateSync(join(folder, 'journal.sqlite-wal'), 0),
    /journal\.sqlite was damaged: it ends with entry 0, where [1-9]\d* had been worked off/,
  ],
];

describe.skipIf(!mosquitto)(
  'a daemon killed amid a stream, and damaged before it comes back',
  () => {
    it.each(DAMAGE)(
      'goes on with %s, tells what is lost, and takes what the broker holds',
      async (_, damage, found) => {
        const service = await startMosquitto(mosquitto!);
        later(() => service.stop());
        const { path, folder } = siteFile(
          { mqtt: { url: service.url, client_id: 'damage-test' } },
          40,
        );
        const site = loadSite(path);
        const flow = site.units[0]!.channels.find(({ role }) => role.kind === 'flow')!;
        const { topic } = site.sources.find(({ channels }) => channels.includes(flow.id))!;
        const client = await publisher(service.url);
        // Hours of a plant in seconds: states are saved meanwhile, which remember what was worked off.
        const start = Date.now() - 5 * 3_600_000;
        const sent: Promise<unknown>[] = [];
        const send = (count: number) => {
          for (let i = 0; i < count; i++) {
            const n = sent.length;
            const text = JSON.stringify({ time: start + n * STEP_MS, value: n, quality: 'good' });
            sent.push(client.publishAsync(topic, text, { qos: 1 }));
          }
        };
        const first = new RockhourProcess(['run', '--config', path, '--log-level', 'warn']);
        await first.ready();
        const stream = setInterval(() => send(50), 10);
        await waitFor('a stream into the journal', () => newest(folder) > 5000, 30_000);
        // Messages come first: states follow as there is time.
        await waitFor('a saved state of it', () => workedOff(folder) > 0, 30_000);
        await first.end('SIGKILL');
        const had = newest(folder);
        clearInterval(stream);
        send(300);
        await Promise.all(sent);
        damage(folder);

        const second = new RockhourProcess(['run', '--config', path, '--log-level', 'info']);
        const [, page] = /page=(\S+)/.exec(await second.ready())!;
        const counters = async () =>
          (await (await fetch(new URL('/api/counters', page))).json()).counters;
        await waitFor('what the broker holds', () => newest(folder) >= sent.length - 1, 30_000);
        send(100);
        await waitFor('what comes since', () => newest(folder) >= sent.length - 1, 30_000);
        const told = await counters();
        expect(await second.end('SIGTERM')).toBe(0);
        const values = storedValues(folder);
        const missing = sent.map((_, n) => n).filter((n) => !values.includes(n));
        expect(new Set(values).size).toBe(values.length);
        // Nothing is lost but what was in the damaged file.
        expect(missing.filter((n) => n > had)).toEqual([]);
        // It was told, in the log and by an event, and what there is of it is kept.
        expect(told.stores_set_aside).toBeGreaterThan(0);
        expect(told.journal_entries_lost).toBeLessThanOrEqual(missing.length);
        if (values[0] !== 0) expect(told.journal_entries_lost).toBeGreaterThan(0);
        expect(second.stderr).toMatch(found);
        expect(second.stderr).toContain('vellmoor/store_damaged/journal');
        expect(readdirSync(folder).some((name) => name.startsWith('journal.sqlite.damaged-'))).toBe(
          true,
        );
      },
      120_000,
    );
  },
);
