import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.js';
import { EXIT_CODES } from '../../src/errors.js';
import { freePort } from '../support/ports.js';
import { requireProgram } from '../support/requirements.js';
import { startMosquitto } from '../support/services.js';
import { waitFor } from '../support/wait.js';
import { later, publisher } from './harness.js';
import { RockhourProcess } from './processes.js';
import { siteFile } from './siteFile.js';

const mosquitto = requireProgram('mosquitto');

const readyLines = (daemon: RockhourProcess) => daemon.stdout.match(/^ready .*/gm) ?? [];

/** Times of a unit's estimates, oldest first. */
function estimates(folder: string): number[] {
  const database = new SQLite(join(folder, 'history.sqlite'), { readonly: true });
  try {
    return database.prepare('SELECT time FROM estimates ORDER BY time').pluck().all() as number[];
  } finally {
    database.close();
  }
}

function journaled(folder: string): number[] {
  const database = new SQLite(join(folder, 'journal.sqlite'), { readonly: true });
  try {
    return database
      .prepare('SELECT value FROM entries WHERE quality < 9 ORDER BY seq')
      .pluck()
      .all() as number[];
  } finally {
    database.close();
  }
}

describe.skipIf(!mosquitto)('SIGHUP to a daemon', () => {
  it('reads the configuration anew: no reading is lost, the estimates go on; faults change nothing', async () => {
    const service = await startMosquitto(mosquitto!);
    later(() => service.stop());
    const { path, folder } = siteFile({ mqtt: { url: service.url, client_id: 'reload' } }, 20);
    const text = readFileSync(path, 'utf8');
    const [unit] = loadSite(path).units;
    const flow = unit!.channels.find(({ role }) => role.kind === 'flow')!;
    const { topic } = loadSite(path).sources.find(({ channels }) => channels.includes(flow.id))!;
    const client = await publisher(service.url);
    const period_ms = unit!.scan_period_s * 1000;
    // A minute of source time lies between two: each closes the scan before.
    const start = Math.floor(Date.now() / period_ms - 2000) * period_ms;
    const daemon = new RockhourProcess(['run', '--config', path]);
    // A broker keeps nothing for a session that it does not know yet.
    await daemon.ready();
    const sent: Promise<unknown>[] = [];
    const stream = setInterval(() => {
      if (sent.length >= 1900) return;
      const n = sent.length;
      const payload = JSON.stringify({ time: start + n * period_ms, value: n / 1000 });
      sent.push(client.publishAsync(topic, payload, { qos: 1 }));
      // 25 a second: what comes while no daemon is there fits into the broker's queue of 1000.
    }, 40);
    later(async () => clearInterval(stream));
    await waitFor('scans', () => estimates(folder).length > 20, 20_000);

    writeFileSync(path, text.replace('path_prefix', 'path_prefax').concat('nonsense: 1\n'));
    daemon.signal('SIGHUP');
    await waitFor('the complaint', () =>
      daemon.stderr.includes('the configuration stays as it was'),
    );
    expect(daemon.stderr).toContain('nonsense');
    expect(readyLines(daemon)).toHaveLength(1);

    const port = await freePort();
    writeFileSync(path, text.replace(/^( *)port: 0$/m, `$1port: ${port}`));
    daemon.signal('SIGHUP');
    await waitFor('the second ready line', () => readyLines(daemon).length === 2, 20_000);
    expect(readyLines(daemon)[1]).toContain(`:${port}/`);
    const health = await fetch(`http://127.0.0.1:${port}/api/health`);
    expect(await health.json()).toHaveProperty('parts');
    const so_far = estimates(folder).length;
    await waitFor('scans after it', () => estimates(folder).length > so_far + 20, 20_000);

    clearInterval(stream);
    await Promise.all(sent);
    await waitFor('the rest', () => journaled(folder).length >= sent.length, 20_000);
    expect(journaled(folder)).toEqual(sent.map((_, n) => n / 1000));
    expect(await daemon.end('SIGTERM')).toBe(0);
    // Each scan is there once, none is left out at the change.
    const times = estimates(folder);
    const steps = new Set(times.slice(1).map((time, i) => time - times[i]!));
    expect([...steps]).toEqual([period_ms]);
  }, 60_000);

  it('goes back to the configuration before where the new one cannot be started with', async () => {
    const taken = await startMosquitto(mosquitto!);
    later(() => taken.stop());
    const { path } = siteFile({ mqtt: { url: taken.url, client_id: 'back' } }, 20);
    const text = readFileSync(path, 'utf8');
    const daemon = new RockhourProcess(['run', '--config', path]);
    await daemon.ready();
    const { port } = new URL(taken.url);
    writeFileSync(path, text.replace(/^( *)port: 0$/m, `$1port: ${port}`));
    daemon.signal('SIGHUP');
    await waitFor('the ready line', () => readyLines(daemon).length === 2, 20_000);
    expect(daemon.stderr).toContain('goes back to the configuration before');
    expect(daemon.stderr).toContain('another program listens there');
    // The same once more, now with a fault of its own: it is still there.
    writeFileSync(path, 'units: [');
    daemon.signal('SIGHUP');
    await waitFor('the complaint', () => daemon.stderr.includes('stays as it was'));
    expect(await daemon.end('SIGINT')).toBe(EXIT_CODES.ok.code);
  }, 60_000);
});
