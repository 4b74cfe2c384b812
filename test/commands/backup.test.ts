import { existsSync, readFileSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { unpackBackup } from '../../src/adapters/history/unitBackup.js';
import { loadSite } from '../../src/config/load.js';
import { EXIT_CODES } from '../../src/errors.js';
import { publisher } from '../daemon/harness.js';
import { RockhourProcess } from '../daemon/processes.js';
import { siteFile } from '../daemon/siteFile.js';
import { rockhour } from '../support/cli.js';

describe('rockhour backup and restore', () => {
  it('take the state of a unit of the demonstration out of a running daemon and put it back', async () => {
    // Scans so long that none is closed while the commands run, however slow the machine.
    const { path, folder } = siteFile({ mqtt: { embedded_port: 0 } }, undefined, {
      scan_period_s: 300,
    });
    const site = loadSite(path);
    const [unit] = site.units as [(typeof site.units)[number]];
    const daemon = new RockhourProcess(['run', '--config', path]);
    const [, page, broker] = / ?page=(\S+) broker=(\S+)/.exec(await daemon.ready())!;
    const client = await publisher(broker!);
    const roles = new Map(unit.channels.map(({ id, role }) => [id, role.kind]));
    const given = (id: string) => (roles.get(id) === 'thermocouple' ? 20 : 0);
    const start = Date.now() - 20 * unit.scan_period_s * 1000;
    const send = (scan: number) =>
      Promise.all(
        site.sources.map(({ topic, payload, channels }) => {
          const time = start + scan * unit.scan_period_s * 1000;
          const content =
            payload === 'array' ? { values: channels.map(given) } : { value: given(channels[0]!) };
          const text = JSON.stringify({ time, quality: 'good', ...content });
          return client.publishAsync(topic, text, { qos: 1 });
        }),
      );
    const counters = async () =>
      ((await (await fetch(`${page}api/counters`)).json()) as { counters: Record<string, number> })
        .counters;
    for (let scan = 0; scan < 3; scan++) await send(scan);
    await expect.poll(async () => (await counters()).scans, { timeout: 10_000 }).toBe(3);
    const out = join(folder, '..', 'unit.gz');
    const on = ['--url', page!, '--unit', unit.id];
    const made = await rockhour(['backup', ...on, '--out', out]);
    expect([made.code, made.stderr]).toEqual([0, '']);
    expect(statSync(out).mode & 0o077).toBe(0);
    const backup = unpackBackup(readFileSync(out));
    expect(backup).toMatchObject({ unit: unit.id, site: site.name });
    for (let scan = 3; scan < 5; scan++) await send(scan);
    await expect.poll(async () => (await counters()).scans).toBe(5);
    const done = await rockhour(['restore', ...on, '--from', out, '--who', 'Ada', '--json']);
    expect([done.code, done.stderr]).toEqual([0, '']);
    expect(JSON.parse(done.stdout)).toMatchObject({
      ...{ who: 'Ada', scans: 2, revised: 0, same_shape: true, reaches: true },
      state_of: new Date(backup.time_ms).toISOString(),
    });
    expect(daemon.stderr).toMatch(/put back to the state of .* by Ada/);
    // A copy of all, beside it.
    const copies = join(folder, '..', 'copies');
    const all = await rockhour(['backup', '--config', path, '--out', copies]);
    expect([all.code, all.stderr]).toEqual([0, '']);
    expect(all.stdout).toContain('stop the daemon');
    expect(existsSync(join(copies, 'journal.sqlite'))).toBe(true);
    // What is of no use is refused in words, before anything is done.
    writeFileSync(out, readFileSync(out).subarray(0, 2000));
    const bad = await rockhour(['restore', ...on, '--from', out]);
    expect(bad.code).toBe(EXIT_CODES.usage.code);
    expect(bad.stderr).toContain('the file is no backup, or was cut off or damaged');
    expect((await counters()).restores).toBe(1);
    expect(await daemon.end('SIGTERM')).toBe(0);
  }, 90_000);

  it.each([
    [['backup', '--out', 'x'], /--url and --unit .* or --config/],
    [['backup', '--url', 'http://localhost', '--config', 'x', '--out', 'x'], /or --config/],
    [['backup', '--url', 'http://localhost', '--out', 'x'], /--url needs --unit/],
    [['backup', '--config', 'x', '--unit', 'u', '--out', 'x'], /--unit goes with --url/],
    [['restore', '--url', 'http://localhost', '--unit', 'u', '--from', 'no/such'], /no such file/],
  ])('%s is refused', async (args, words) => {
    const { code, stderr } = await rockhour(args);
    expect(code).toBe(EXIT_CODES.usage.code);
    expect(stderr).toMatch(words);
  });
});
