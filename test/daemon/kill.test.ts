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

/** Entries in the journal of a daemon that may be running. */
function entries(folder: string): number {
  const database = new SQLite(join(folder, 'journal.sqlite'), { readonly: true });
  try {
    return database
      .prepare('SELECT count(*) FROM entries WHERE quality < 9')
      .pluck()
      .get() as number;
  } finally {
    database.close();
  }
}

function storedValues(folder: string): number[] {
  const journal = new Journal(join(folder, 'journal.sqlite'));
  journal.start();
  const found = journal.read(0, 1e6).flatMap((entry) => {
    return entry.kind === 'reading' ? [entry.value] : [];
  });
  journal.stop();
  return found;
}

const pause = (ms: number) => new Promise((resolve) => setTimeout(resolve, ms));

describe.skipIf(!mosquitto)('the daemon as a process', () => {
  it('killed three times amid a stream of readings, has each of them once and in order', async () => {
    const service = await startMosquitto(mosquitto!);
    later(() => service.stop());
    const { path, folder } = siteFile({ mqtt: { url: service.url, client_id: 'kill-test' } });
    const site = loadSite(path);
    const flow = site.units[0]!.channels.find(({ role }) => role.kind === 'flow')!;
    const { topic } = site.sources.find(({ channels }) => channels.includes(flow.id))!;
    const client = await publisher(service.url);
    const start = Date.now() - 60_000;
    const sent: Promise<unknown>[] = [];
    const send = (count: number) => {
      for (let i = 0; i < count; i++) {
        const n = sent.length;
        const text = JSON.stringify({ time: start + n, value: n, quality: 'good' });
        sent.push(client.publishAsync(topic, text, { qos: 1 }));
      }
    };
    for (let round = 0; round < 3; round++) {
      const daemon = new RockhourProcess(['run', '--config', path, '--log-level', 'warn']);
      await daemon.ready();
      const before = entries(folder);
      const stream = setInterval(() => send(50), 10);
      await waitFor('a stream into the journal', () => entries(folder) > before + 300);
      await daemon.end('SIGKILL');
      await pause(50);
      clearInterval(stream);
    }
    await Promise.all(sent);
    const last = new RockhourProcess(['run', '--config', path]);
    expect(await last.ready()).toMatch(
      /^ready page=http:\S+ broker=mqtt:\S+ database="[^"]+" units=vellmoor$/,
    );
    await waitFor('the rest', () => entries(folder) >= sent.length, 20_000);
    const asked = performance.now();
    expect(await last.end('SIGTERM')).toBe(0);
    expect(performance.now() - asked).toBeLessThan(5000);
    expect(storedValues(folder)).toEqual(sent.map((_, n) => n));
  }, 120_000);
});
