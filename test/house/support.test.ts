import { existsSync, mkdtempSync, readFileSync } from 'node:fs';
import { createServer } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, describe, expect, it, vi } from 'vitest';
import { temporaryFolder } from '../support/folders.js';
import { freePort } from '../support/ports.js';
import { findProgram, requireProgram } from '../support/requirements.js';
import { startInflux, startMosquitto } from '../support/services.js';
import { waitFor } from '../support/wait.js';

afterEach(() => {
  vi.unstubAllEnvs();
});

describe('what tests stand on', () => {
  it('finds a program by any of its names, and says null where there is none', () => {
    expect(findProgram(['no-such-program-here', 'sh'])).toMatch(/\/sh$/);
    expect(findProgram(['no-such-program-here'])).toBeNull();
  });

  it('hands out a port that can be listened on', async () => {
    const port = await freePort();
    const server = createServer();
    await new Promise<void>((resolve, reject) => {
      server.once('error', reject);
      server.listen(port, '127.0.0.1', resolve);
    });
    expect(port).toBeGreaterThan(1023);
    server.close();
  });

  it('makes folders that differ', () => {
    const one = temporaryFolder('a');
    expect(existsSync(one)).toBe(true);
    expect(temporaryFolder('a')).not.toBe(one);
  });

  it('says for what it waited in vain', async () => {
    await expect(waitFor('the sun at midnight', () => false, 30, 5)).rejects.toThrow(
      'the sun at midnight',
    );
  });

  it('enters a missing program once per asking in the register', () => {
    const register = join(mkdtempSync(join(tmpdir(), 'register-')), 'missing.txt');
    vi.stubEnv('ROCKHOUR_TEST_REGISTER', register);
    const path = requireProgram('mosquitto');
    if (path === null) expect(readFileSync(register, 'utf8')).toContain('mosquitto');
    else expect(existsSync(register)).toBe(false);
  });
});

const mosquitto = requireProgram('mosquitto');
describe.skipIf(!mosquitto)('a broker of the test', () => {
  it('starts, stops and starts again on its port', async () => {
    const broker = await startMosquitto(mosquitto ?? '');
    await broker.stop('SIGKILL');
    await broker.start();
    await broker.stop();
    await broker.stop();
    expect(broker.url).toBe(`mqtt://127.0.0.1:${broker.port}`);
  });
});

const influxd = requireProgram('influxd');
describe.skipIf(!influxd)('a time-series database of the test', () => {
  it('answers its ping and stops', async () => {
    const influx = await startInflux(influxd ?? '');
    expect((await fetch(`${influx.url}/ping`)).status).toBe(204);
    await influx.stop();
    await expect(fetch(`${influx.url}/ping`)).rejects.toThrow();
  });
});
