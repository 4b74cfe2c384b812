import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { JsonLinesWriter } from '../../../src/adapters/recording/lines.js';
import { RecordingWriter } from '../../../src/adapters/recording/writer.js';
import { temporaryFolder } from '../../support/folders.js';
import { channel, read, thermocouple } from './small.js';

describe('a written recording', () => {
  it('is read back to the last bit', async () => {
    const folder = temporaryFolder('writer');
    const row = fc.tuple(
      fc.double({ noDefaultInfinity: true }),
      fc.double({ noDefaultInfinity: true }),
    );
    const unit = {
      id: 'U1',
      channels: [thermocouple('T,1', {}, 'K'), channel('power', { kind: 'power' }, 'W')],
    };
    await fc.assert(
      fc.asyncProperty(fc.array(row, { maxLength: 20 }), async (rows) => {
        const path = join(folder, 'run.csv');
        const writer = await RecordingWriter.open(path, ['T,1', 'power', 'note']);
        for (const [i, fields] of rows.entries())
          await writer.write(i * 500, [...fields, 'a "b",\nc']);
        await writer.close();
        expect(writer.rows).toBe(rows.length);
        const { scans, fault } = await read(readFileSync(path), unit);
        expect(fault).toBeNull();
        expect(scans.map((scan) => scan.time_ms)).toEqual(rows.map((_, i) => i * 500));
        // K and W pass through: plus 0 and times 1 change nothing but the sign of a zero.
        expect(scans.map((scan) => [...scan.values])).toEqual(rows.map((r) => r.map((x) => x + 0)));
      }),
      { seed: 2, numRuns: 40 },
    );
  });

  it('leaves a missing value empty and ends its lines as the RFC says', async () => {
    const path = join(temporaryFolder('writer'), 'run.csv');
    const writer = await RecordingWriter.open(path, ['a', 'b', 'c']);
    await writer.write(0, [null, Number.NaN, 1.5]);
    await writer.close();
    expect(readFileSync(path, 'utf8')).toBe('time,a,b,c\r\n1970-01-01T00:00:00.000Z,,,1.5\r\n');
    await expect(writer.write(1, [1])).rejects.toThrow(RangeError);
  });
});

describe('JSON Lines', () => {
  it('holds one value a line, in order, also past the buffer', async () => {
    const path = join(temporaryFolder('lines'), 'out.jsonl');
    const writer = new JsonLinesWriter(path);
    const long = 'x'.repeat(1000);
    const warnings: string[] = [];
    const hear = (warning: Error) => warnings.push(warning.message);
    process.on('warning', hear);
    for (let i = 0; i < 2000; i++) await writer.writeValue({ i, long, nan: Number.NaN });
    await writer.close();
    const lines = readFileSync(path, 'utf8').trimEnd().split('\n');
    process.off('warning', hear);
    // A listener left behind at each wait would be warned of.
    expect(warnings).toEqual([]);
    expect(lines.map((line) => JSON.parse(line).i)).toEqual([...Array(2000).keys()]);
    expect(JSON.parse(lines[0] ?? '').nan).toBeNull();
  });

  it('says which file cannot be written', async () => {
    const path = join(temporaryFolder('lines'), 'no', 'such', 'folder', 'out.jsonl');
    const writer = new JsonLinesWriter(path);
    await writer.writeValue(1);
    await expect(writer.close()).rejects.toMatchObject({
      code: 'OUTPUT_UNWRITABLE',
      message: expect.stringContaining(path),
    });
  });
});
