import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { holders } from '../access/holders.js';
import { temporaryFolder } from '../support/folders.js';
import { freePort } from '../support/ports.js';
import { RockhourProcess } from './processes.js';
import { siteFile } from './siteFile.js';

const PASSWORDS = {
  mqtt: 'planted-mqtt-5a1f',
  influx: 'planted-influx-9c3e',
  webhook: 'planted-webhook-77d0',
};

describe('planted secrets', () => {
  it('appear in no log line, answer, counter or last word of a daemon', async () => {
    const { tokens, list } = holders();
    const folder = temporaryFolder('secrets');
    const at = (name: keyof typeof PASSWORDS) => {
      const file = join(folder, name);
      writeFileSync(file, `${PASSWORDS[name]}\n`, { mode: 0o600 });
      return file;
    };
    // Nobody listens there: what is said of each failure is said to somebody.
    const [broker, database, receiver] = [await freePort(), await freePort(), await freePort()];
    const { path } = siteFile({
      mqtt: {
        ...{ url: `mqtt://127.0.0.1:${broker}`, username: 'rock', password_file: at('mqtt') },
      },
      influx: {
        ...{ url: `http://127.0.0.1:${database}`, username: 'rock', password_file: at('influx') },
      },
      notify: {
        webhooks: [
          { id: 'hook', url: `http://127.0.0.1:${receiver}/in`, secret_file: at('webhook') },
        ],
      },
      http: { port: 0, tokens: list },
    });
    const daemon = new RockhourProcess(['run', '--config', path, '--log-level', 'trace']);
    const url = /page=(\S+)/.exec(await daemon.ready())![1]!;
    await expect.poll(() => daemon.stderr, { timeout: 10_000 }).toMatch(/InfluxDB at .* cannot be/);

    const said: string[] = [];
    const ask = async (route: string, init: RequestInit = {}, token = tokens.configure) => {
      const headers = { authorization: `Bearer ${token}`, ...init.headers };
      const answer = await fetch(url + route, { ...init, headers });
      said.push(JSON.stringify([...answer.headers]), await answer.text());
    };
    const post = (route: string, body: unknown) =>
      ask(route, {
        method: 'POST',
        body: JSON.stringify(body),
        headers: { 'content-type': 'application/json' },
      });
    for (const route of [
      'api/health',
      'api/counters',
      'metrics',
      'api/openapi.json',
      'api/login',
    ]) {
      await ask(route);
    }
    await ask('api/units', {}, `${tokens.view}-not`);
    await ask(`api/units?token=${tokens.view}`);
    await ask(`api/nothing/${tokens.view}`);
    await ask(`api/units/${tokens.view}/history`);
    await post('api/login', { token: [tokens.view] });
    await post('api/login', { tokn: tokens.view });
    await post('api/alarms/acknowledge', { id: tokens.view, who: tokens.feed });
    await post('api/alarms/acknowledge', { [tokens.view]: 1 });
    expect(said.join().match(/"error"/g)!.length).toBeGreaterThan(6);

    await daemon.end('SIGTERM');
    const everything = [daemon.stdout, daemon.stderr, ...said].join('\n');
    const planted = [...Object.values(PASSWORDS), ...Object.values(tokens)];
    expect(planted.filter((secret) => everything.includes(secret))).toEqual([]);
    // Nor what the configuration knows of them.
    expect(list.filter(({ hash }) => everything.includes(hash))).toEqual([]);
  }, 60_000);
});
