import { connect, createServer, type Socket } from 'node:net';
import { join } from 'node:path';
import SQLite from 'better-sqlite3';
import { expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.js';
import { later, publisher } from './harness.js';
import { RockhourProcess } from './processes.js';
import { Rig, reading } from './rewind/rig.js';
import { PERIOD_MS } from './site.js';
import { siteFile } from './siteFile.js';

/** A service that takes connections and says nothing, ever. */
async function hungService(): Promise<{ port: number; heard(): string }> {
  const sockets: Socket[] = [];
  let text = '';
  const server = createServer((socket) => {
    sockets.push(socket);
    socket.on('error', () => undefined);
    socket.on('data', (chunk) => {
      text += chunk.toString();
    });
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  later(async () => {
    for (const socket of sockets) socket.destroy();
    server.close();
  });
  return { port: (server.address() as { port: number }).port, heard: () => text };
}

/** A client of the live stream that reads nothing of it. */
async function deafClient(page: string): Promise<void> {
  const { hostname, port } = new URL(page);
  const socket = connect(Number(port), hostname);
  later(async () => void socket.destroy());
  await new Promise<void>((resolve) => socket.once('connect', resolve));
  socket.on('error', () => undefined);
  socket.pause();
  const lines = ['GET /api/stream HTTP/1.1', `Host: ${hostname}:${port}`];
  socket.write(`${lines.join('\r\n')}\r\nAccept: text/event-stream\r\n\r\n`);
}

it('SIGTERM ends it within 5 s with its state saved, whatever hangs', async () => {
  const [database, receiver] = [await hungService(), await hungService()];
  const { path, folder } = siteFile({
    mqtt: { embedded_port: 0 },
    influx: { url: `http://127.0.0.1:${database.port}` },
    notify: { webhooks: [{ id: 'hook', url: `http://127.0.0.1:${receiver.port}/in` }] },
  });
  const site = loadSite(path);
  const [unit] = site.units as [(typeof site.units)[number]];
  const daemon = new RockhourProcess(['run', '--config', path]);
  const [, page, broker] = / ?page=(\S+) broker=(\S+)/.exec(await daemon.ready())!;
  const client = await publisher(broker!);
  // Two scans with an hour of silence between them: that is an alert, for the receiver.
  const roles = new Map(unit.channels.map(({ id, role }) => [id, role.kind]));
  const given = (id: string) => (roles.get(id) === 'thermocouple' ? 300 : 0);
  for (const time of [Date.now() - 7_200_000, Date.now() - 3_600_000]) {
    await Promise.all(
      site.sources.map(({ topic, payload, channels }) => {
        const values = channels.map(given);
        const content = payload === 'array' ? { values } : { value: values[0] };
        const text = JSON.stringify({ time, quality: 'good', ...content });
        return client.publishAsync(topic, text, { qos: 1 });
      }),
    );
  }
  await expect.poll(receiver.heard, { timeout: 20_000 }).toContain('POST /in');
  await expect.poll(database.heard, { timeout: 20_000 }).toMatch(/^(GET|POST) /);
  await deafClient(page!);
  const asked = fetch(`${page}api/units/${unit.id}/sensors?over=day`).then(
    () => 'answered',
    () => 'cut off',
  );
  await expect
    .poll(async () => {
      const { counters } = (await (await fetch(`${page}api/counters`)).json()) as {
        counters: { questions: number };
      };
      return counters.questions;
    })
    .toBeGreaterThan(0);
  const began = performance.now();
  expect(await daemon.end('SIGTERM')).toBe(0);
  expect(performance.now() - began).toBeLessThan(5000);
  expect(await asked).toBe('cut off');
  const history = new SQLite(join(folder, 'history.sqlite'), { readonly: true });
  const saved = history.prepare('SELECT count(*) FROM checkpoints').pluck().get();
  history.close();
  expect(saved).toBeGreaterThan(0);
  // It did all of its end, and was not cut off by its own limit: the log says which.
  expect(daemon.stderr).not.toContain('left behind');
}, 90_000);

it('a rewind under way is left at once, and begun again at the next start', async () => {
  const start = Date.UTC(2026, 0, 5, 6);
  const rig = await new Rig().start();
  const at = (i: number, n: number) => start + i * PERIOD_MS + n;
  const scan = (i: number) => ['a', 'b', 'c'].map((one, n) => reading(one, at(i, n), 300 + i));
  for (let i = 0; i < 100; i++) await rig.take(i === 40 ? scan(i).slice(1) : scan(i));
  await rig.take([reading('a', at(40, 0), 340, at(100, 0))]);
  rig.steady_ms += 31_000;
  rig.rewinder.poll();
  expect(rig.rewinder.busyWith).toBe('u');
  rig.stop();
  const next = await new Rig({ folder: rig.folder }).start();
  expect(next.rewinder.isAwaited('u')).toBe(true);
  await next.settle();
  expect(next.counters.get('rewinds')).toBe(1);
  expect(next.counters.get('late_used')).toBe(1);
  next.stop();
});
