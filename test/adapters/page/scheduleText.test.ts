import { describe, expect, it } from 'vitest';
import { asText, hoursOf, readSchedule } from '../../../src/adapters/page/trader/scheduleText.js';

const read = (text: string) => readSchedule(text, '2026-01-31', '06:10');

describe('a schedule as it is typed or pasted', () => {
  it.each([
    ['commas, decimal point', '18:00, 20:00, 1.8'],
    ['commas, decimal comma', '18:00, 20:00, 1,8'],
    ['blanks, decimal comma', '18:00 20:00 1,8'],
    ['tabs of a spreadsheet', '31.01.2026 18:00\t31.01.2026 20:00\t1,8'],
    ['semicolons', '2026-01-31 18:00;2026-01-31 20:00;1,8'],
    ['blanks with dates', '2026-01-31 18:00 2026-01-31 20:00 1.8'],
    ['a mode behind', '18:00; 20:00; 1.8; discharge'],
    ['quotes and a mark of the order of bytes', '\ufeff"18:00","20:00","1.8"'],
    ['a header of its own order', 'mode,power_MW_el,to,from\r\ndischarge,1.8,20:00,18:00\r\n'],
    ['seconds', '18:00:00,20:00:00,1.8'],
  ])('reads %s', (_name, text) => {
    const { blocks, faults } = read(text);
    expect(faults).toEqual([]);
    expect(blocks).toHaveLength(1);
    expect(blocks[0]).toMatchObject({
      ...{ mode: 'discharge', power_MW_el: 1.8 },
      ...{ from: '2026-01-31T18:00', to: '2026-01-31T20:00' },
    });
  });

  it('reads what the API writes, with offsets, and writes it again', () => {
    const text =
      'from,to,mode,power_MW_el\n2026-03-28T17:00:00+01:00,2026-03-28T18:30:00+01:00,charge,2.4';
    const { blocks, faults } = read(text);
    expect(faults).toEqual([]);
    expect(blocks).toMatchObject([
      { line: 2, mode: 'charge', power_MW_el: 2.4, from: '2026-03-28T17:00+01:00' },
    ]);
    expect(hoursOf(blocks[0]!)).toBe(1.5);
    expect(read(asText(blocks)).blocks).toEqual(blocks);
  });

  it('tells the direction by the sign, and follows times of day over midnight', () => {
    const { blocks, faults } = read(
      '22:00 24:00 2\n00:00 03:30 -2,4\n04:00 05:00 0\n05:30 05:00 1',
    );
    expect(faults).toEqual([]);
    expect(blocks.map(({ mode, power_MW_el, from, to }) => [mode, power_MW_el, from, to])).toEqual([
      ['discharge', 2, '2026-01-31T22:00', '2026-02-01T00:00'],
      ['charge', 2.4, '2026-02-01T00:00', '2026-02-01T03:30'],
      ['stand', 0, '2026-02-01T04:00', '2026-02-01T05:00'],
      ['discharge', 1, '2026-02-01T05:30', '2026-02-02T05:00'],
    ]);
    // Before now is of tomorrow.
    expect(read('05:00 06:00 1').blocks[0]!.from).toBe('2026-02-01T05:00');
  });

  it.each([
    ['18:00, 20:00', /^2 fields; a row is: from, to, MW$/],
    ['soon, 20:00, 1', /“soon” is no time to begin at; such as/],
    ['18:00, 25:00, 1', /“25:00” is no time to end at/],
    ['2026-02-30 18:00, 2026-03-01 18:00, 1', /no time to begin at/],
    ['18:00, 20:00, lots', /“lots” is no power in MW/],
    ['18:00, 20:00, sell, 1', /“sell” is no mode; charge, discharge or stand/],
    ['18:00, 20:00, discharge, -1', /a discharge has no power below 0/],
    ['18:00, 20:00, charge,', /a charge needs its power/],
    ['18:00, 20:00, stand, 1', /a stand has no power/],
    ['18:00, 18:00, 1', /ends at 2026-01-31 18:00, not after it begins/],
    ['from, MW', /a header needs the columns from and to/],
  ])('says what is wrong with %s', (text, words) => {
    const { blocks, faults } = read(text);
    expect(blocks).toEqual([]);
    expect(faults).toHaveLength(1);
    expect(faults[0]!.words).toMatch(words);
  });

  it('names each line that is wrong and keeps the others', () => {
    const { blocks, faults } = read('18:00 19:00 1\n\n19:00 x 1\n20:00 21:00 y');
    expect(blocks.map(({ line }) => line)).toEqual([1]);
    expect(faults.map(({ line }) => line)).toEqual([3, 4]);
  });

  it('tells rows that lie over each other', () => {
    const rows = '2026-02-01 18:00,2026-02-01 20:00,1\n2026-02-01 19:30,2026-02-01 21:00,1';
    expect(read(rows).faults).toEqual([
      { line: 2, words: 'it begins at 2026-02-01 19:30, before the row of line 1 ends' },
    ]);
  });
});
