import { spawnSync } from 'node:child_process';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.js';
import { temporaryFolder } from '../support/folders.js';
import { requireProgram } from '../support/requirements.js';
import { startMosquitto } from '../support/services.js';
import { acknowledgedAfterSync, callsOf } from '../support/syncTrace.js';
import { later, publisher } from './harness.js';
import { RockhourProcess } from './processes.js';
import { siteFile } from './siteFile.js';

const mosquitto = requireProgram('mosquitto');
const strace = requireProgram('strace');
const CALLS = 'trace=pwrite64,fdatasync,fsync,write,writev,sendto,sendmsg';
/** Some containers forbid one process to look at another. */
const mayTrace = strace !== null && spawnSync(strace, ['-e', 'trace=none', 'true']).status === 0;

describe.skipIf(!mosquitto || !mayTrace)('the system calls of the daemon', () => {
  it('show each reading synced to the journal before its acknowledgement is sent', async () => {
    const service = await startMosquitto(mosquitto!);
    later(() => service.stop());
    const { path } = siteFile({ mqtt: { url: service.url, client_id: 'sync-test' } });
    const site = loadSite(path);
    const flow = site.units[0]!.channels.find(({ role }) => role.kind === 'flow')!;
    const { topic } = site.sources.find(({ channels }) => channels.includes(flow.id))!;
    const out = join(temporaryFolder('trace'), 'calls');
    const options = ['-f', '-y', '-xx', '-s', '70000', '--seccomp-bpf', '-e', CALLS, '-o', out];
    const daemon = new RockhourProcess(['run', '--config', path], false, [strace!, ...options]);
    await daemon.ready();
    const client = await publisher(service.url);
    const start = Date.now() - 60_000;
    const values = Array.from({ length: 400 }, (_, i) => 1000.123 + i);
    const text = (i: number) => JSON.stringify({ time: start + i, value: values[i] });
    // In bursts of every size, as they come: some groups of the journal are full, some are not.
    for (let i = 0, size = 1; i < values.length; size = (size * 7) % 61) {
      const burst = values.slice(i, i + size);
      await Promise.all(burst.map((_, n) => client.publishAsync(topic, text(i + n), { qos: 1 })));
      i += burst.length;
    }
    const found = () => acknowledgedAfterSync(callsOf(readFileSync(out, 'utf8')), values);
    await expect.poll(() => found().acknowledged, { timeout: 30_000 }).toBe(values.length);
    // A signal to strace would end only strace: it goes to the traced process, which heads the file.
    process.kill(Number(/^\d+/.exec(readFileSync(out, 'utf8'))![0]), 'SIGTERM');
    expect(await daemon.ended()).toBe(0);
    const { early, syncs } = found();
    expect(early).toEqual([]);
    expect(syncs).toBeGreaterThan(values.length / 61);

    // The proof itself can fail: without the journal's syncs every acknowledgement comes too early.
    const unsynced = callsOf(readFileSync(out, 'utf8')).filter(({ kind }) => kind !== 'sync');
    expect(acknowledgedAfterSync(unsynced, values).early).toHaveLength(values.length);
  }, 120_000);
});
