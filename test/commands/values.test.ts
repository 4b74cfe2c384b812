import { describe, expect, it } from 'vitest';
import { table } from '../../src/commands/table.js';
import { parseDuration_s, parsePoint_ms, parsePowers_W } from '../../src/commands/values.js';

describe('values on the command line', () => {
  it.each([
    ['90', 90],
    ['90s', 90],
    ['30min', 1800],
    ['1.5h', 5400],
    ['2 d', 172_800],
  ])('%s is a span of %d s', (text, span_s) => {
    expect(parseDuration_s('--every', text)).toBe(span_s);
  });

  it('takes powers in MW and a point in time', () => {
    expect(parsePowers_W('--power', '1.2, 2')).toEqual([1.2e6, 2e6]);
    expect(parsePoint_ms('--at', '1970-01-01T01:00:00+01:00')).toBe(0);
  });

  it.each([
    () => parseDuration_s('--hours-every', '0min'),
    () => parseDuration_s('--hours-every', '-1h'),
    () => parseDuration_s('--hours-every', '30 parsecs'),
    () => parsePowers_W('--power', '1.2,,3'),
    () => parsePowers_W('--power', '0'),
    () => parsePowers_W('--power', '1e999'),
    () => parsePowers_W('--power', 'all'),
    () => parsePoint_ms('--at', 'noon'),
  ])('names the option, the value and what was expected (%#)', (parse) => {
    expect(parse).toThrow(
      expect.objectContaining({
        code: 'USAGE',
        exitCode: 2,
        message: expect.stringMatching(/^--[a-z-]+ is ".*"; expected .+/),
      }),
    );
  });
});

describe('a table in text', () => {
  it('puts numbers to the right and words to the left', () => {
    const rows = [
      [1.2, '10.00', 'hot_outlet'],
      [10, '9.50', 'flow'],
    ];
    expect(table(['MW', 'hours', 'ends by'], rows)).toBe(
      [' MW  hours  ends by', '1.2  10.00  hot_outlet', ' 10   9.50  flow'].join('\n'),
    );
    expect(() => table(['a'], [[1, 2]])).toThrow(RangeError);
  });
});
