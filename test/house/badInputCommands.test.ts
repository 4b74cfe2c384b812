import { readdirSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.js';
import { EXIT_CODES } from '../../src/errors.js';
import { siteFile } from '../daemon/siteFile.js';
import { rockhour, startRockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { freePort } from '../support/ports.js';
import { waitFor } from '../support/wait.js';
import { expectRefusal, refused } from './badInput.js';

const DEMO = 'config/demo.yaml';
const folder = temporaryFolder('bad-commands');
const recording = join(folder, 'run.csv');
writeFileSync(recording, 'time,x\n0,1\n');
const BASE = ['--config', DEMO, '--recording', recording, '--out', join(folder, 'out.jsonl')];

describe('a wrong command line', () => {
  it.each([
    [['replai'], "unknown command 'replai' (Did you mean replay?)"],
    [['--wrong'], "unknown option '--wrong'"],
    [['replay'], "'--config <file>'"],
    [['replay', '--config', DEMO], "'--recording <file>'"],
    [['replay', '--config', DEMO, '--recording'], 'argument missing'],
    [['replay', ...BASE, '--hour-at', '2'], 'Did you mean --hours-at?'],
    [['replay', ...BASE, 'more'], 'too many arguments'],
    [['replay', ...BASE, '--hours-at', ''], '--hours-at is ""; expected powers'],
    [['replay', ...BASE, '--hours-at', '2,x'], '--hours-at is "2,x"; expected powers'],
    [['replay', ...BASE, '--hours-every', '0'], '--hours-every is "0"; expected a time span'],
    [['hours'], "'--power <MW>'"],
    [['hours', '--power', '1'], 'hours needs --config and --recording, or --url'],
    [['hours', '--power', '1', '--url', 'here'], '--url is "here"; expected an address'],
    [['hours', '--power', 'NaN', '--url', 'http://127.0.0.1:1'], '--power is "NaN"; expected'],
    [['check'], 'check needs --config'],
    [['check', '--config', DEMO, '--schema'], 'do not go together'],
    [['check', 'more'], 'too many arguments'],
    [['run'], "'--config <file>'"],
    [['run', '--config', DEMO, '--log-level', 'loud'], '--log-level is "loud"; expected one of'],
    [['demo', '--speed', 'fast'], '--speed is "fast"; expected a number from 1 to 2000'],
    [['demo', '--speed', ''], '--speed is ""; expected'],
    [['demo', '--http-port', '80.5'], '--http-port is "80.5"; expected a whole number'],
    [['demo', '--mqtt-port', '65536'], '--mqtt-port is "65536"; expected a number from 0 to 65535'],
    [['demo', '--seed', 'x'], '--seed is "x"; expected'],
    [['demo', '--check-hours', '0'], '--check-hours is "0"; expected'],
    [['demo', '--json'], '--json goes with --check-hours only'],
  ])('%j is answered with one message', async (args, words) => {
    const { stderr } = await refused(args, 'USAGE');
    expect(stderr).toContain(words);
  });

  it('shows the help where no command, or none of this name, is asked for', async () => {
    for (const args of [[], ['help', 'nothing']]) {
      const { code, stderr } = await rockhour(args);
      expect(stderr).toMatch(/^Usage: rockhour/);
      expect(code).toBe(EXIT_CODES.usage.code);
    }
  });
});

describe('places on the disk and in the network that cannot be', () => {
  it.each([
    ['no-such.yaml', 'no such file'],
    [folder, 'a folder'],
  ])('a configuration that is %s, for every command that takes one', async (path, words) => {
    const commands = [
      ['check', '--config', path],
      ['run', '--config', path],
      ['demo', '--config', path],
      ['replay', '--config', path, '--recording', recording, '--out', join(folder, 'o')],
      ['hours', '--config', path, '--recording', recording, '--power', '1'],
    ];
    await Promise.all(commands.map((args) => refused(args, 'CONFIG_UNREADABLE', words)));
  });

  it('a recording or an output that is a folder or has no name', async () => {
    const to = (recorded: string, out: string) => [
      ...['replay', '--config', DEMO, '--recording', recorded, '--out', out],
    ];
    const out = join(folder, 'o');
    await refused(to(folder, out), 'RECORDING_UNREADABLE', 'it is a folder');
    await refused(to('', out), 'RECORDING_UNREADABLE', 'the recording "" cannot be read');
    const columns = loadSite(DEMO).units[0]!.channels.map(({ id }) => id);
    const sound = join(folder, 'sound.csv');
    writeFileSync(sound, `time,${columns.join(',')}\n0${','.repeat(columns.length)}\n`);
    await refused(to(sound, folder), 'OUTPUT_UNWRITABLE', 'it is a folder');
    await refused(to(sound, ''), 'OUTPUT_UNWRITABLE', 'the output "" cannot be written');
  });

  it('a daemon that is not there', async () => {
    const url = `http://127.0.0.1:${await freePort()}`;
    const args = ['hours', '--power', '1', '--url', url];
    const { stderr } = await rockhour(args);
    expect(stderr).toMatch(/^rockhour: GET .*\/api\/units got no answer: connect ECONNREFUSED/);
    expect((await rockhour(args)).code).toBe(EXIT_CODES.outside.code);
  });

  it.each([
    ['below a file', join(recording, 'data'), 'a part of its path is a file'],
    ['that is a file', recording, 'there is a file of this name'],
    // mkdir -p of Node 20 would try for ever here.
    ['below /proc', '/proc/rockhour', 'no such file or folder'],
  ])('a store.folder %s', async (_, place, words) => {
    const { path } = siteFile({ store: { folder: place }, mqtt: { embedded_port: 0 } });
    await refused(['run', '--config', path], 'STORE_FAILED', place, words);
  });
});

describe('a demonstration that is interrupted while it is scored', () => {
  it('says how far it came and leaves no folder behind', async () => {
    const own = temporaryFolder('interrupted');
    const child = startRockhour(['demo', '--check-hours', '5000'], { TMPDIR: own });
    let stderr = '';
    child.stderr!.on('data', (chunk: Buffer) => {
      stderr += chunk.toString();
    });
    const ended = new Promise<number | null>((resolve) => child.once('close', resolve));
    // The loader of the sources keeps a cache there too.
    const demos = () => readdirSync(own).filter((name) => name.includes('demo'));
    await waitFor('its folder', () => demos().length === 1, 20_000);
    // Under way, not only just begun.
    await new Promise((resolve) => setTimeout(resolve, 2000));
    child.kill('SIGINT');
    const code = await ended;
    const words = /stopped by SIGINT after [\d.]+ of 5000 simulated hours/;
    expectRefusal({ code, stdout: '', stderr }, 'INTERRUPTED', words);
    expect(demos()).toEqual([]);
  });
});

describe('whoever reads standard error goes away', () => {
  it('does not end a daemon with it', async () => {
    const { path } = siteFile({ mqtt: { url: `mqtt://127.0.0.1:${await freePort()}` } });
    const child = startRockhour(['run', '--config', path]);
    const ended = new Promise<number | null>((resolve) => child.once('close', resolve));
    child.stderr!.destroy();
    let said = '';
    child.stdout!.on('data', (chunk: Buffer) => {
      said += chunk.toString();
    });
    await waitFor('the ready line', () => said.includes('ready '), 30_000);
    const [, page] = / page=(\S+)/.exec(said)!;
    // The broker is away, which the log says, to nobody.
    await new Promise((resolve) => setTimeout(resolve, 1500));
    const units = await fetch(`${page}api/units`);
    expect(units.status).toBe(200);
    child.kill('SIGTERM');
    expect(await ended).toBe(0);
  });
});
