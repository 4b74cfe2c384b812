import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { beforeAll, describe, expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.js';
import type { UnitDefinition } from '../../src/core/definitions.js';
import { EXIT_CODES } from '../../src/errors.js';
import { writeSynthetic } from '../commands/synthetic.js';
import { type Finished, rockhour, startRockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { waitFor } from '../support/wait.js';
import { expectRefusal, refused } from './badInput.js';

const CONFIG = 'config/demo.yaml';
const folder = temporaryFolder('bad-recording');
const unit: UnitDefinition = loadSite(CONFIG).units[0]!;
/** A sound recording of twelve rows, its header first. */
let sound: string[][];

beforeAll(async () => {
  const path = join(folder, 'sound.csv');
  await writeSynthetic(path, unit, { rows: 12 });
  sound = rowsOf(path);
});

function rowsOf(path: string): string[][] {
  const lines = readFileSync(path, 'utf8').trimEnd().split('\r\n');
  return lines.map((line) => line.split(','));
}

function write(name: string, content: string | readonly string[][]): string {
  const path = join(folder, `${name}.csv`);
  const text = (rows: readonly string[][]) => rows.map((row) => `${row.join(',')}\n`).join('');
  writeFileSync(path, typeof content === 'string' ? content : text(content));
  return path;
}

const argsOf = (path: string, out = `${path}.jsonl`) => [
  ...['replay', '--config', CONFIG, '--recording', path, '--out', out],
];

function linesOf(path: string): { time: string; quality: string }[] {
  const text = readFileSync(`${path}.jsonl`, 'utf8');
  expect(text === '' || text.endsWith('\n')).toBe(true);
  return text
    .split('\n')
    .filter((line) => line !== '')
    .map((line) => JSON.parse(line));
}

async function accepted(path: string, ...parts: (string | RegExp)[]): Promise<Finished> {
  const finished = await rockhour(argsOf(path));
  expect(finished.code, finished.stderr).toBe(0);
  for (const part of parts) expect(finished.stderr).toMatch(part);
  return finished;
}

describe('a recording with nothing in it', () => {
  it.each([
    ['empty', ''],
    ['blank', '\n\n\r\n'],
  ])('%s: is refused, by replay and by hours', async (name, text) => {
    const path = write(name, text);
    await refused(argsOf(path), 'RECORDING_MALFORMED', 'is empty', 'a header');
    const hours = ['hours', '--power', '1', '--config', CONFIG, '--recording', path];
    await refused(hours, 'RECORDING_MALFORMED', 'is empty');
  });

  it('a header alone gives no line and says so; hours have nothing to stand on', async () => {
    const path = write('header', sound.slice(0, 1));
    await accepted(path, '0 rows read, 0 lines written', 'has a header but no rows');
    expect(linesOf(path)).toEqual([]);
    const hours = ['hours', '--power', '1', '--config', CONFIG, '--recording', path];
    await refused(hours, 'RECORDING_MALFORMED', 'a header but no rows');
  });
});

describe('a recording whose columns are wrong', () => {
  const without = (...names: string[]) => {
    const header = sound[0]!;
    return sound.map((row) => row.filter((_, i) => !names.includes(header[i]!)));
  };

  it('names the one that is missing, the first twelve of many, and time', async () => {
    const [first] = unit.stores[0]!.strings[0]!.thermocouples;
    const one = write('one', without(first!.id));
    await refused(argsOf(one), 'RECORDING_COLUMN_MISSING', `no column ${first!.id}, which`);
    const hot = unit.stores[0]!.strings.flatMap((one) => one.thermocouples.map(({ id }) => id));
    const many = await refused(argsOf(write('many', without(...hot))), 'RECORDING_COLUMN_MISSING');
    expect(many.stderr).toContain(`and ${hot.length - 12} more, which unit ${unit.id} needs`);
    await refused(argsOf(write('timeless', without('time'))), 'RECORDING_COLUMN_MISSING', 'time');
  });

  it('needs flow or power, and says what it does without', async () => {
    const neither = write('neither', without('flow', 'power'));
    await refused(argsOf(neither), 'RECORDING_COLUMN_MISSING', 'no column flow');
    await accepted(write('no-flow', without('flow')), 'without a column, taken as missing: flow');
  });

  it('names a column that stands there twice, and separators that are no commas', async () => {
    const twice = sound.map((row) => [...row, row[1]!]);
    await refused(argsOf(write('twice', twice)), 'RECORDING_MALFORMED', 'stands there twice');
    const text = sound.map((row) => row.join(';')).join('\n');
    await refused(argsOf(write('semicolons', text)), 'RECORDING_MALFORMED', 'semicolons');
    const other = Buffer.from(`\ufeff${sound.map((row) => row.join(',')).join('\n')}`, 'utf16le');
    writeFileSync(join(folder, 'wide.csv'), other);
    await refused(argsOf(join(folder, 'wide.csv')), 'RECORDING_MALFORMED', 'UTF-16');
  });
});

describe('a recording whose fields are wrong', () => {
  const changed = (change: (rows: string[][]) => void) => {
    const rows = sound.map((row) => [...row]);
    change(rows);
    return rows;
  };

  it('takes text, NaN and infinities for missing readings, counts the text and goes on', async () => {
    const path = write(
      'text',
      changed((rows) => {
        rows[3]![1] = 'Bad';
        rows[4]![1] = 'NaN';
        rows[5]![1] = 'Infinity';
        rows[6]![1] = '"12 degC"';
        rows[7]![1] = '1e999';
      }),
    );
    const { stderr } = await accepted(path, '4 fields with text instead of a number');
    expect(stderr).toContain('row 4, hot_axis_01: "Bad"');
    expect(linesOf(path)).toHaveLength(12);
  });

  it('says what decimal commas need', async () => {
    const path = write(
      'commas',
      changed((rows) => {
        rows[2]![1] = '"455,9"';
      }),
    );
    await accepted(path, /^1 field with text instead/m, 'a decimal point, not a comma');
  });

  it('refuses a time without offset, and a row that no quote ends, with the lines before it kept', async () => {
    const local = write(
      'local',
      changed((rows) => {
        rows[4]![0] = '2025-03-01T06:01:30';
      }),
    );
    await refused(argsOf(local), 'RECORDING_MALFORMED', 'row 5: the time "2025-03-01T06:01:30"');
    expect(linesOf(local)).toHaveLength(3);
    const open = write(
      'open',
      changed((rows) => {
        rows[6]![1] = '"455.9';
      }),
    );
    await refused(argsOf(open), 'RECORDING_MALFORMED', 'row 7: a quoted field that does not end');
    expect(linesOf(open)).toHaveLength(5);
  });

  it('names the row where time runs back, and keeps the lines before it', async () => {
    const path = write('back', [...sound.slice(0, 8), ...sound.slice(4)]);
    await refused(argsOf(path), 'RECORDING_TIME_BACK', 'row 9: time runs back', 'in row 8');
    expect(linesOf(path).map(({ time }) => time)).toEqual(
      sound.slice(1, 8).map(([time]) => new Date(time!).toISOString()),
    );
  });
});

describe('a replay that is interrupted', () => {
  it.each(['SIGINT', 'SIGTERM'] as const)(
    '%s: ends at once with whole lines, and says how many rows they are of',
    async (signal) => {
      const path = join(folder, `long-${signal}.csv`);
      // Some ten seconds of work on any machine, of which the first fraction is enough.
      await writeSynthetic(path, unit, { rows: 4000 });
      const child = startRockhour(argsOf(path));
      let stderr = '';
      child.stderr!.on('data', (chunk: Buffer) => {
        stderr += chunk.toString();
      });
      const ended = new Promise<number | null>((resolve) => child.once('close', resolve));
      const size = () => readFileSync(`${path}.jsonl`).length;
      await waitFor('the first lines', () => {
        try {
          return size() > 0;
        } catch {
          return false;
        }
      });
      const asked = performance.now();
      child.kill(signal);
      const code = await ended;
      expect(performance.now() - asked).toBeLessThan(3000);
      expectRefusal({ code, stdout: '', stderr }, 'INTERRUPTED', `stopped by ${signal} after`);
      expect(code).toBe(EXIT_CODES.interrupted.code);
      const lines = linesOf(path);
      expect(stderr).toContain(`after ${lines.length} rows of ${path}`);
      const rows = rowsOf(path).slice(1, lines.length + 1);
      expect(lines.map(({ time }) => time)).toEqual(
        rows.map(([time]) => new Date(time!).toISOString()),
      );
      expect(lines.length).toBeLessThan(4000);
    },
    30_000,
  );
});
