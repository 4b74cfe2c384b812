import { describe, expect, it } from 'vitest';
import { blocksOfDay, writtenIn } from '../../../src/core/plan/localTime.js';
import {
  type Fault,
  readBlocks,
  requireSchedule,
  type WrittenBlock,
} from '../../../src/core/plan/scheduleAsk.js';
import { csvPath, readScheduleCsv } from '../../../src/core/plan/scheduleCsv.js';

const ZONE = 'Europe/Paris';
const NOW_MS = Date.UTC(2026, 9, 24, 6);
const NOON = {
  mode: 'discharge',
  power_MW_el: 1.5,
  from: '2026-10-24T12:00',
  to: '2026-10-24T13:00',
};

function faultsOf(written: readonly WrittenBlock[], zone: string | null = ZONE): readonly Fault[] {
  const read = readBlocks(written, zone, NOW_MS);
  return 'faults' in read ? read.faults : [];
}

describe('blocks as they are written', () => {
  it('are read in any order, with and without offset, standing without power', () => {
    const read = readBlocks(
      [
        { mode: 'stand', from: '2026-10-24T13:00+02:00', to: '2026-10-24T12:00Z' },
        { ...NOON, power_MW_el: '1.5' },
      ],
      ZONE,
      NOW_MS,
    );
    const noon = Date.UTC(2026, 9, 24, 10);
    expect(read).toEqual({
      blocks: [
        { mode: 'discharge', power_W: 1.5e6, from_ms: noon, to_ms: noon + 3.6e6 },
        { mode: 'stand', power_W: 0, from_ms: noon + 3.6e6, to_ms: noon + 7.2e6 },
      ],
    });
  });

  it('of a day on which the clocks change come out as its 92, 96 and 100 quarter-hours', () => {
    for (const [date, count] of [
      ['2026-03-29', 92],
      ['2026-06-01', 96],
      ['2026-10-25', 100],
    ] as const) {
      const day = blocksOfDay(date, ZONE, 15);
      const written = day.map(({ from_ms, to_ms }) => ({
        mode: 'charge',
        power_MW_el: 2,
        from: writtenIn(ZONE, from_ms),
        to: writtenIn(ZONE, to_ms),
      }));
      const read = readBlocks(written, null, day[0]!.from_ms);
      const blocks = 'blocks' in read ? read.blocks : [];
      expect(blocks).toHaveLength(count);
      expect(blocks.map(({ from_ms, to_ms }) => ({ from_ms, to_ms }))).toEqual(day);
    }
  });

  it.each([
    [
      'a negative power',
      { power_MW_el: -1.5 },
      'power_MW_el',
      -1.5,
      /from 0 to 10000: the direction/,
    ],
    ['a power that is none', { power_MW_el: '0x10' }, 'power_MW_el', '0x10', /^a power in MW_el/],
    ['no power', { power_MW_el: null }, 'power_MW_el', null, /^a power in MW_el/],
    ['power while standing', { mode: 'stand' }, 'power_MW_el', 1.5, /^0 or none while standing/],
    ['an unknown mode', { mode: 'sell' }, 'mode', 'sell', /^one of charge, discharge, stand$/],
    [
      'a past start',
      { from: '2026-10-24T07:59' },
      'from',
      '2026-10-24T07:59',
      /2026-10-24T08:00:00\+02:00 or later, the time of the estimate/,
    ],
    [
      'an end that is no later',
      { to: '2026-10-24T12:00' },
      'to',
      '2026-10-24T12:00',
      /^later than from, 2026-10-24T12:00:00\+02:00/,
    ],
    [
      'an end too far ahead',
      { to: '2026-11-01T12:00' },
      'to',
      '2026-11-01T12:00',
      /^2026-10-31T07:00:00\+01:00 or earlier, 7 days/,
    ],
    [
      'a time shown twice',
      { to: '2026-10-25T02:15' },
      'to',
      '2026-10-25T02:15',
      /^an offset, since the clocks of/,
    ],
    ['a number for a time', { from: 1782000000 }, 'from', 1782000000, /^a time in ISO 8601/],
  ])('are refused for %s', (_, change, field, value, expected) => {
    const faults = faultsOf([{ ...NOON, ...change }]);
    expect(faults[0]).toEqual({
      field: `blocks.0.${field}`,
      value,
      expected: expect.stringMatching(expected),
    });
  });

  it('are refused before the clock of who asks, where that is later than the estimate', () => {
    const asked_ms = Date.UTC(2026, 9, 24, 10, 0, 30);
    const read = readBlocks([NOON], ZONE, NOW_MS, undefined, asked_ms);
    expect(read).toMatchObject({
      faults: [
        {
          field: 'blocks.0.from',
          expected: '2026-10-24T12:00:30+02:00 or later, the present: that time is past',
        },
      ],
    });
    // A clock that is behind the estimate changes nothing.
    expect(readBlocks([NOON], ZONE, NOW_MS, undefined, NOW_MS - 1e6)).toHaveProperty('blocks');
    const noon = { mode: 'stand', power_W: 0, from_ms: asked_ms - 1, to_ms: asked_ms + 1 } as const;
    const ask = { blocks: [noon], certainty: 0.9, zone: ZONE };
    expect(() => requireSchedule(ask, NOW_MS)).not.toThrow();
    expect(() => requireSchedule({ ...ask, asked_ms }, NOW_MS)).toThrow(/the present/);
  });

  it('are refused where they overlap, with the end of the one before', () => {
    const later = { ...NOON, from: '2026-10-24T12:45', to: '2026-10-24T14:00' };
    expect(faultsOf([later, NOON])).toEqual([
      {
        field: 'blocks.0.from',
        value: '2026-10-24T12:45',
        expected: expect.stringMatching(/^2026-10-24T13:00:00\+02:00 or later.*may not overlap$/),
      },
    ]);
    expect(faultsOf([{ ...later, from: '2026-10-24T13:00' }, NOON])).toEqual([]);
  });

  it('are refused for a zone that there is not, none at all, and more than a person can mean', () => {
    expect(faultsOf([NOON], 'Europe/Atlantis')).toMatchObject([{ field: 'zone' }]);
    expect(faultsOf([NOON], null)).toMatchObject([
      { field: 'blocks.0.from', expected: expect.stringContaining('or a time zone') },
      { field: 'blocks.0.to' },
    ]);
    expect(faultsOf([])).toMatchObject([
      { field: 'blocks', value: 0, expected: '1 to 400 blocks' },
    ]);
    expect(faultsOf(Array(401).fill(NOON))).toMatchObject([{ field: 'blocks', value: 401 }]);
  });

  it('tell every fault at once', () => {
    const faults = faultsOf([
      { ...NOON, mode: 'sell', power_MW_el: -1 },
      { ...NOON, from: 'noon' },
    ]);
    expect(faults.map(({ field }) => field)).toEqual([
      'blocks.0.mode',
      'blocks.0.power_MW_el',
      'blocks.1.from',
    ]);
  });
});

describe('a schedule within the program', () => {
  const block = { mode: 'discharge', power_W: 1e6, from_ms: NOW_MS, to_ms: NOW_MS + 9e5 } as const;

  it('is held against the same rules', () => {
    const ask = { blocks: [block], certainty: 0.9, zone: ZONE };
    expect(() => requireSchedule(ask, NOW_MS)).not.toThrow();
    expect(() => requireSchedule({ ...ask, certainty: 0.4 }, NOW_MS)).toThrow(
      new RangeError('certainty = 0.4: expected 0.5 to 0.99'),
    );
    expect(() => requireSchedule(ask, NOW_MS + 1000)).toThrow(
      /^blocks\.0\.from = "2026-10-24T06:00:00Z": expected .* or later/,
    );
    const blocks = [{ ...block, to_ms: Number.NaN }];
    expect(() => requireSchedule({ ...ask, blocks }, NOW_MS)).toThrow(/expected finite times/);
  });
});

describe('a schedule as CSV', () => {
  const header = 'from,to,mode,power_MW_el';
  const row = '2026-10-24T12:00,2026-10-24T13:00,discharge,1.5';

  it.each([
    ['CRLF', `${header}\r\n${row}\r\n`],
    ['LF, a byte order mark and no last line end', `\ufeff${header}\n${row}`],
    ['blank lines', `${header}\r\n\r\n${row}\r\n\r\n`],
    ['quotes', `"from","to",mode,"power_MW_el"\r\n${row.replace('discharge', '"discharge"')}\r\n`],
    ['other order', 'mode,power_MW_el,to,from\ndischarge,1.5,2026-10-24T13:00,2026-10-24T12:00\n'],
  ])('is read with %s', (_, text) => {
    const read = readScheduleCsv(text);
    expect(read).toMatchObject({ blocks: [{ ...NOON, power_MW_el: '1.5' }] });
  });

  it('reads what a quoted field holds', () => {
    const read = readScheduleCsv(`${header}\n"a ""b"",\nc",d,e,\nf,g,h,1`);
    expect(read).toEqual({
      rows: [2, 3],
      blocks: [
        { from: 'a "b",\nc', to: 'd', mode: 'e', power_MW_el: '' },
        { from: 'f', to: 'g', mode: 'h', power_MW_el: '1' },
      ],
    });
  });

  it.each([
    ['no header', row, { field: 'row 1', expected: `the columns ${header}` }],
    ['nothing', '', { field: 'row 1', value: '' }],
    ['a column that is unknown', `${header},price\n`, { field: 'row 1' }],
    ['a column twice', `${header},mode\n`, { field: 'row 1' }],
    ['a row too short', `${header}\n${row}\n1,2\n`, { field: 'row 3', value: '1,2' }],
    ['an open quote', `${header}\n"2026`, { field: 'row 2', expected: 'a quoted field that ends' }],
    ['text after a quote', `${header}\n"a"b,c,d,e`, { field: 'row 2' }],
    ['a stray quote', `${header}\na"b,c,d,e`, { field: 'row 2', value: 'a"b' }],
  ])('is refused for %s, with the row', (_, text, fault) => {
    expect(readScheduleCsv(text)).toMatchObject({ faults: [fault] });
  });

  it('names the row of a block that is wrong', () => {
    const read = readScheduleCsv(`${header}\n\n${row}\n${row.replace('discharge', 'sell')}\n`);
    if (!('blocks' in read)) throw new Error('not read');
    const faults = readBlocks(read.blocks, ZONE, NOW_MS, csvPath(read.rows));
    expect(faults).toMatchObject({ faults: [{ field: 'row 4 mode', value: 'sell' }] });
  });
});
