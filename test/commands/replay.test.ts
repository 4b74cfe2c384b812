import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.js';
import type { UnitDefinition } from '../../src/core/definitions.js';
import { type Finished, rockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { START_MS, writeSynthetic } from './synthetic.js';

const CONFIG = 'config/demo.yaml';
const folder = temporaryFolder('replay');
const recording = join(folder, 'run.csv');
let unit: UnitDefinition;

function file(name: string): string {
  return join(folder, name);
}

function replay(out: string, ...more: string[]): Promise<Finished> {
  const base = ['replay', '--config', CONFIG, '--recording', recording, '--out', out];
  return rockhour([...base, ...more]);
}

// biome-ignore lint/suspicious/noExplicitAny: what a reader of the file sees, unknown beforehand
function lines(path: string): any[] {
  return readFileSync(path, 'utf8')
    .trimEnd()
    .split('\n')
    .map((line) => JSON.parse(line));
}

/** Changed text of the recording, as a file of its own. */
function changed(name: string, change: (text: string) => string): string {
  writeFileSync(file(name), change(readFileSync(recording, 'utf8')));
  return file(name);
}

beforeAll(async () => {
  unit = loadSite(CONFIG).units[0]!;
  await writeSynthetic(recording, unit, { rows: 12, empty: [5, 6] });
});

describe('rockhour replay', () => {
  it('writes one line per row, all-empty rows included, and tells what it did', async () => {
    const out = file('plain.jsonl');
    const { code, stdout, stderr } = await replay(out);
    expect(stderr).toContain('12 rows read, 12 lines written');
    expect(code).toBe(0);
    expect(stdout).toBe('');
    const all = lines(out);
    expect(all.map((line) => Date.parse(line.time))).toEqual(
      [...Array(12).keys()].map((i) => START_MS + i * unit.scan_period_s * 1000),
    );
    for (const line of all) {
      expect(line).toMatchObject({ unit: unit.id, revision: 0 });
      expect(['charge', 'discharge', 'stand']).toContain(line.mode);
      expect(['good', 'degraded', 'blind', 'stale']).toContain(line.quality);
      expect(Object.keys(line.stores)).toEqual(unit.stores.map((store) => store.id));
      expect(Array.isArray(line.events)).toBe(true);
    }
  });

  it('gives the same bytes for the same recording, also where it comes in another form', async () => {
    const first = file('first.jsonl');
    await replay(first, '--hours-at', '1');
    // A byte order mark, LF, the columns turned round, seconds for times, a row that is replaced.
    const other = changed('other.csv', (text) => {
      const rows = text
        .trimEnd()
        .split('\r\n')
        .map((line) => line.split(',').reverse());
      for (const row of rows.slice(1)) row[row.length - 1] = String(Date.parse(row.at(-1)!) / 1000);
      const stale = rows[3]!.map((field, i) => (i === rows[3]!.length - 1 ? field : '1'));
      rows.splice(3, 0, stale);
      return `\ufeff${rows.map((row) => row.join(',')).join('\n')}`;
    });
    const second = file('second.jsonl');
    const args = ['replay', '--config', CONFIG, '--recording', other, '--out', second];
    const { stderr } = await rockhour([...args, '--hours-at', '1']);
    expect(stderr).toContain('1 row replaced by a later one of the same time');
    expect(readFileSync(second, 'utf8')).toBe(readFileSync(first, 'utf8'));
  });

  it('computes hours at the powers and as often as asked, at the first row and then by interval', async () => {
    const out = file('hours.jsonl');
    const { code } = await replay(out, '--hours-at', '1.0,1.5', '--hours-every', '2min');
    expect(code).toBe(0);
    const asked = lines(out).map((line) =>
      line.dispatch?.map((one: { power_MW: number }) => one.power_MW),
    );
    // Scans every 30 s from a full hour on: each fourth one begins an interval of two minutes.
    expect(unit.scan_period_s).toBe(30);
    expect(asked.map((powers) => powers !== undefined)).toEqual(
      [...Array(12).keys()].map((i) => i % 4 === 0),
    );
    expect(asked[0]).toEqual([1, 1.5]);
    for (const { hours, energy_MWh_el, power_MW } of lines(out)[0].dispatch) {
      expect(hours.p90).toBeLessThanOrEqual(hours.p50);
      expect(hours.p50).toBeLessThanOrEqual(hours.p10);
      // Constant power: energy is power times hours, to the rounding of one product.
      expect(energy_MWh_el.p50).toBeCloseTo(power_MW * hours.p50, 9);
    }
  });

  it('writes to standard output, and its summary as JSON', async () => {
    const piped = await replay('-');
    expect(piped.stdout.trimEnd().split('\n')).toHaveLength(12);
    // The machine gives 2 MW: asked for more it is answered, with a word on standard error.
    const summed = await replay(file('summed.jsonl'), '--json', '--hours-at', '2.5,1');
    expect(JSON.parse(summed.stdout)).toMatchObject({
      ...{ unit: unit.id, rows: 12, lines: 12 },
      limited: { '2.5 MW above_greatest_power': 1 },
    });
    expect(Object.keys(lines(file('summed.jsonl'))[0].dispatch[0])).not.toContain('limited_by');
  });
});

describe('rockhour replay of bad input', () => {
  const refused = async (args: string[], code: number, ...words: string[]) => {
    const result = await rockhour(['replay', ...args]);
    for (const word of words) expect(result.stderr).toContain(word);
    expect(result.stderr).not.toMatch(/\n\s+at /);
    expect(result.code).toBe(code);
  };
  const withRecording = (path: string, out = file('refused.jsonl')) => [
    ...['--config', CONFIG, '--recording', path, '--out', out],
  ];

  it('takes text for a missing reading and says where, once for unknown columns', async () => {
    const path = changed('text.csv', (text) =>
      text
        .replace(/^time/, 'remark,time')
        .replace(/\r\n(?=2025)/g, '\r\nshift A,')
        .replace(/(06:00:30[^,]*),[^,]*/, '$1,Bad'),
    );
    const { code, stderr } = await rockhour(['replay', ...withRecording(path)]);
    expect(stderr).toContain('1 field with text instead of a number');
    expect(stderr).toContain('row 3');
    expect(stderr.match(/remark/g)).toHaveLength(1);
    expect(code).toBe(0);
  });

  it.each([
    [['--unit', 'nowhere'], 2, 'nowhere'],
    [['--hours-at', '-2'], 2, '--hours-at is "-2"'],
    [['--hours-every', 'often'], 2, '--hours-every is "often"'],
    [['--out', '/no/such/folder/out.jsonl'], 4, '/no/such/folder/out.jsonl'],
  ])('answers %j with one clear message', async (change, code, words) => {
    await refused([...withRecording(recording), ...change], code, words);
  });

  it('leaves an older output as it was where it fails before the first line', async () => {
    const out = file('older.jsonl');
    writeFileSync(out, 'older\n');
    await refused(withRecording('no-such.csv', out), 3, 'no-such.csv');
    expect(readFileSync(out, 'utf8')).toBe('older\n');
  });

  it('does not write over the recording', async () => {
    const before = readFileSync(recording, 'utf8');
    await refused(withRecording(recording, recording), 2, 'same file');
    expect(readFileSync(recording, 'utf8')).toBe(before);
  });
});

describe('rockhour hours from a recording', () => {
  const base = ['hours', '--config', CONFIG, '--recording', recording];

  it('gives what the replay gives for the same row', async () => {
    const out = file('same.jsonl');
    await replay(out, '--hours-at', '1.2', '--hours-every', '30s');
    const replayed = lines(out);
    for (const [at, row] of [
      [undefined, 11],
      ['2025-03-01T07:01:40+01:00', 3],
    ] as const) {
      const args = [...base, '--power', '1.2', '--json', ...(at ? ['--at', at] : [])];
      const { stdout } = await rockhour(args);
      const answer = JSON.parse(stdout);
      expect(answer.time).toBe(replayed[row].time);
      expect(answer.age_s).toBe(at ? 10 : 0);
      expect(answer.answers).toEqual([{ ...replayed[row].dispatch[0], limited_by: null }]);
      for (const key of ['valid_until', 'given', 'limits']) expect(answer).toHaveProperty(key);
    }
  });

  it('prints a table for people', async () => {
    const { stdout, code } = await rockhour([...base, '--power', '1,0.3']);
    expect(code).toBe(0);
    expect(stdout).toMatch(/MW +h p90 +h p50 +h p10/);
    expect(stdout).toMatch(/^0\.3 MW cannot be given .*below_least_power.*can hold\.$/m);
    expect(stdout.trimEnd().split('\n')).toHaveLength(6);
  });

  it.each([
    [['--power', '1', '--at', '0'], 'begins at'],
    [['--power', '1', '--url', 'http://127.0.0.1:1'], '--url asks a daemon'],
  ])('answers %j with one clear message', async (args, words) => {
    const { code, stderr } = await rockhour([...base, ...args]);
    expect(stderr).toContain(words);
    expect(code).toBe(2);
  });
});

describe('rockhour itself', () => {
  it('documents its exit codes in its help', async () => {
    const { code, stdout } = await rockhour(['--help']);
    expect(code).toBe(0);
    for (const word of ['replay', 'hours', 'Exit codes', '70', 'advises']) {
      expect(stdout).toContain(word);
    }
  });

  it('prints its version', async () => {
    expect((await rockhour(['--version'])).stdout.trim()).toMatch(/^\d+\.\d+\.\d+$/);
  });
});
