import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { certaintyOf, writtenSchedule } from '../../src/commands/schedule/question.js';
import { loadSite } from '../../src/config/load.js';
import { testApp } from '../adapters/http/httpApp.js';
import { rockhour } from '../support/cli.js';
import { temporaryFolder } from '../support/folders.js';
import { writeSynthetic } from './synthetic.js';

const CONFIG = 'config/demo.yaml';
const folder = temporaryFolder('schedule');
const recording = join(folder, 'run.csv');
const day = join(folder, 'day.csv');
const near = join(folder, 'near.csv');

/** Local to Berlin, where the demonstration plant is connected; the recording ends at 07:09:30. */
const ROWS = [
  'from,to,mode,power_MW_el',
  '2025-03-01T08:00,2025-03-01T09:00,discharge,1.5',
  '2025-03-01T09:00,2025-03-01T12:00,discharge,1.0',
];

beforeAll(async () => {
  await writeSynthetic(recording, loadSite(CONFIG).units[0]!, { rows: 20 });
  writeFileSync(day, `${ROWS.join('\r\n')}\r\n`);
});

function schedule(...options: string[]) {
  return rockhour(['schedule', '--config', CONFIG, '--recording', recording, ...options]);
}

describe('rockhour schedule of a recording', () => {
  it('tells people whether it holds, and writes the nearest that does, which it then finds held', async () => {
    const { stdout, code } = await schedule('--blocks', day, '--nearest', near);
    expect(code).toBe(0);
    expect(stdout).toMatch(/^vellmoor: estimate of 2025-03-01T06:09:30.000Z/);
    expect(stdout).toMatch(/^Holds with 0\.0 %\. First shortfall:$/m);
    expect(stdout).toMatch(/^ {2}with 50 %: from 2025-03-01T11:\d\d:\S+ on 0\.\d{3} MWh_el, /m);
    expect(stdout).toMatch(/^2025-03-01T08:00:00\+01:00 .*discharge +1\.500 +1\.500 /m);
    expect(stdout).toMatch(/^Nearest that holds with 90\.0 %: discharging powers x 0\.\d{4}; /m);
    const [header, first] = readFileSync(near, 'utf8').split('\r\n');
    expect(header).toBe('from,to,mode,power_MW_el');
    expect(first).toMatch(
      /^2025-03-01T08:00:00\+01:00,2025-03-01T09:00:00\+01:00,discharge,1\.\d{1,8}$/,
    );
    const again = await schedule('--blocks', near, '--json');
    expect(JSON.parse(again.stdout).probability).toBeGreaterThan(0.88);
  });

  it('says what is wrong with a question and what would be right', async () => {
    const wrong = await schedule('--block', 'discharge -1 2025-03-01T05:00 2025-03-01T09:00');
    expect(wrong.code).toBe(2);
    expect(wrong.stderr).toContain('--block 1 power_MW_el is "-1"; expected a power in MW_el');
    expect(wrong.stderr).toContain(
      '--block 1 from is "2025-03-01T05:00"; expected 2025-03-01T07:09',
    );
  });
});

describe('rockhour schedule of a daemon', () => {
  let built: Awaited<ReturnType<typeof testApp>>;
  let url: string;
  beforeAll(async () => {
    built = await testApp();
    url = await built.app.listen({ port: 0, host: '127.0.0.1' });
  });
  afterAll(() => built.app.close());

  it('posts the blocks with zone and certainty, and shows what comes back', async () => {
    const { stdout, stderr, code } = await rockhour([
      ...['schedule', '--url', url, '--zone', 'Europe/Berlin', '--certainty', '0.95'],
      ...['--block', 'discharge 1.5 2026-01-31T17:00 2026-01-31T18:00'],
      ...['--block', 'stand 2026-01-31T18:00 2026-01-31T18:30'],
    ]);
    expect(stderr).toBe('');
    expect(code).toBe(0);
    const from_ms = Date.UTC(2026, 0, 31, 16);
    expect(built.plant.planAsked).toMatchObject([
      {
        kind: 'schedule',
        ask: {
          blocks: [
            { mode: 'discharge', power_W: 1.5e6, from_ms, to_ms: from_ms + 3.6e6 },
            { mode: 'stand', power_W: 0 },
          ],
          certainty: 0.95,
          zone: 'Europe/Berlin',
        },
      },
    ]);
    expect(stdout).toContain('Holds with 75.0 %; as far as allowed 80.0 %.');
    expect(stdout).toMatch(/^What machine, connection or outages do not allow:$/m);
    expect(stdout).toMatch(/start_up +1\.000 +0\.050$/m);
    expect(stdout).toMatch(/^discharge .* 80\.0 % +-0\.20 +0\.40 +> 1\.0 +hot_outlet +no$/m);
    expect(stdout).toContain('discharging powers x 0.9000, without what is not allowed; it holds');
  });

  it('passes on what the daemon says is wrong', async () => {
    const past = 'discharge 1.5 2026-01-31T05:00Z 2026-01-31T18:00Z';
    const { stderr, code } = await rockhour(['schedule', '--url', url, '--block', past]);
    expect(stderr).toContain('blocks.0.from is "2026-01-31T05:00Z"; expected 2026-01-31T06:00:04Z');
    expect(code).toBe(2);
  });
});

describe('the options of rockhour schedule', () => {
  const file = join(folder, 'other');
  const read = (text: string) => {
    writeFileSync(file, text);
    return writtenSchedule({ blocks: file });
  };
  const block = { mode: 'charge', power_MW_el: 2, from: 'a', to: 'b' };

  it('read JSON, a list or the body of the HTTP API, and CSV', () => {
    expect(read(JSON.stringify([block])).blocks).toEqual([block]);
    expect(read(`\ufeff${JSON.stringify({ blocks: [block] })}`).blocks).toEqual([block]);
    const csv = read('from,to,mode,power_MW_el\n\na,b,charge,2\n');
    expect(csv.blocks).toEqual([{ ...block, power_MW_el: '2' }]);
    expect(csv.pathOf(0, 'mode')).toBe(`${file} row 3 mode`);
  });

  it.each([
    ['{"blocks": 3}', 'expected [{"mode"'],
    ['[1]', 'expected [{"mode"'],
    ['[', 'is not JSON'],
    ['from;to\n', 'row 1 is "from;to"; expected the columns from,to,mode,power_MW_el'],
  ])('refuse the file %s', (text, said) => {
    expect(() => read(text)).toThrow(said);
  });

  it('refuse what does not go together, and what is no certainty', () => {
    expect(() => writtenSchedule({})).toThrow('either --blocks with a file, or one --block');
    expect(() => writtenSchedule({ blocks: file, block: ['x'] })).toThrow('either --blocks');
    expect(() => writtenSchedule({ blocks: join(folder, 'none') })).toThrow('no such file');
    expect(() => writtenSchedule({ block: ['sell 1 a b'] })).toThrow('--block is "sell 1 a b"');
    expect(certaintyOf({})).toBe(0.9);
    for (const certainty of ['0.4', '1', 'high', '90']) {
      expect(() => certaintyOf({ certainty })).toThrow('expected 0.5 to 0.99, such as 0.9');
    }
  });
});
