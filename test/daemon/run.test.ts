import { mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { createServer } from 'node:net';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { parse, stringify } from 'yaml';
import { EXIT_CODES } from '../../src/errors.js';
import { rockhour } from '../support/cli.js';
import { freePort } from '../support/ports.js';
import { waitFor } from '../support/wait.js';
import { later } from './harness.js';
import { RockhourProcess } from './processes.js';
import { siteFile } from './siteFile.js';

const run = (path: string) => rockhour(['run', '--config', path, '--log-level', 'error']);
const OWN_BROKER = { mqtt: { embedded_port: 0 } };

/** A port that this test itself listens on. */
async function takenPort(): Promise<number> {
  const port = await freePort();
  const server = createServer();
  await new Promise<void>((resolve) => server.listen(port, '127.0.0.1', resolve));
  later(() => new Promise((resolve) => server.close(resolve)));
  return port;
}

/** What a user sees: no stack, and as many lines as a message has. */
function expectOneMessage(stderr: string, ...parts: (string | RegExp)[]): void {
  for (const part of parts) expect(stderr).toMatch(part);
  expect(stderr).not.toMatch(/^\s+at /m);
  expect(stderr.match(/^rockhour: /gm)).toHaveLength(1);
}

describe('rockhour run', () => {
  it('shows all faults of a configuration at once', async () => {
    const { path } = siteFile({ http: { port: 'many' }, mqtt: { protocol: 3, qoss: 1 } });
    const { code, stdout, stderr } = await run(path);
    expect(code).toBe(EXIT_CODES.usage.code);
    expect(stdout).toBe('');
    expectOneMessage(stderr, 'http.port', 'mqtt.protocol', 'qoss');
  });

  it('leaves a unit with faults out, says so everywhere, and runs the others; check refuses', async () => {
    const { path } = siteFile(OWN_BROKER, 20);
    const site = parse(readFileSync(path, 'utf8')) as { units: Record<string, unknown>[] };
    const [unit] = site.units;
    site.units.push({ ...unit, id: 'faulty', name: 'Faulty one', rated_hours_h: -6 });
    writeFileSync(path, stringify(site));
    expect((await rockhour(['check', '--config', path])).code).toBe(EXIT_CODES.usage.code);
    const rockhours = new RockhourProcess(['run', '--config', path]);
    const ready = await rockhours.ready();
    expect(ready).toMatch(/ units=vellmoor$/);
    expect(rockhours.stderr).toMatch(/unit faulty is left out.*units\[1\]\.rated_hours_h/s);
    const page = / page=(\S+)/.exec(ready)![1]!;
    const health = await (await fetch(`${page}api/health`)).json();
    expect(health.parts).toContainEqual({
      ...{ name: 'unit faulty', ok: false },
      detail: expect.stringContaining('units[1].rated_hours_h: found -6'),
    });
    const list = await (await fetch(`${page}api/units`)).json();
    expect(list.units.map(({ unit: id }: { unit: string }) => id)).toEqual(['vellmoor']);
    expect(list.left_out).toMatchObject([{ unit: 'faulty', name: 'Faulty one' }]);
    expect(list.left_out[0].faults[0]).toMatchObject({ path: 'units[1].rated_hours_h' });
    expect(await rockhours.end('SIGTERM')).toBe(0);
  });

  it('names a port that is in use, of the page as of the broker', async () => {
    const port = await takenPort();
    const page = siteFile({ ...OWN_BROKER, http: { port } });
    const first = await run(page.path);
    expect(first.code).toBe(EXIT_CODES.outside.code);
    expectOneMessage(first.stderr, String(port), 'http.port', /\[PORT_IN_USE\]/);
    const broker = siteFile({ mqtt: { embedded_port: port } });
    const second = await run(broker.path);
    expect(second.code).toBe(EXIT_CODES.outside.code);
    expectOneMessage(second.stderr, String(port), 'mqtt.embedded_port', /\[PORT_IN_USE\]/);
  });

  it('refuses a file that is no database of its own', async () => {
    const { path, folder } = siteFile(OWN_BROKER);
    mkdirSync(folder);
    writeFileSync(join(folder, 'journal.sqlite'), 'notes of the shift\n'.repeat(500));
    const { code, stderr } = await run(path);
    expect(code).toBe(EXIT_CODES.outside.code);
    expectOneMessage(stderr, 'journal.sqlite', 'no database of rockhour', /\[STORE_FAILED\]/);
  });

  it('is up without its broker, says once that it has none, and keeps a second one out of its folder', async () => {
    const port = await freePort();
    const { path } = siteFile({ mqtt: { url: `mqtt://127.0.0.1:${port}` } });
    const daemon = new RockhourProcess(['run', '--config', path]);
    const line = await daemon.ready();
    expect(line).toContain(`broker=mqtt://127.0.0.1:${port}`);
    const [, page] = / page=(\S+)/.exec(line)!;
    await waitFor('the complaint', () =>
      daemon.stderr.includes('no connection to the MQTT broker'),
    );
    const second = await run(path);
    expect(second.code).toBe(EXIT_CODES.outside.code);
    expectOneMessage(second.stderr, 'another rockhour uses the folder');
    const health = (await (await fetch(`${page}api/health`)).json()) as object;
    expect(JSON.stringify(health)).toContain('keeps trying');
    expect(await daemon.end('SIGINT')).toBe(0);
    expect(daemon.stderr.match(/no connection to the MQTT broker/g)).toHaveLength(1);
  }, 60_000);
});
