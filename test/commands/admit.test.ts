import { describe, expect, it } from 'vitest';
import { parse } from 'yaml';
import { hashOf, TOKEN_PATTERN } from '../../src/access/token.js';
import { readTokens } from '../../src/access/tokensFile.js';
import { rockhour } from '../support/cli.js';

describe('rockhour admit', () => {
  it('prints a token once, and lines that the configuration and a tokens file take', async () => {
    const { code, stdout } = await rockhour(['admit', '--name', 'ada', '--role', 'view']);
    expect(code).toBe(0);
    const found = stdout.match(new RegExp(TOKEN_PATTERN, 'g'));
    expect(found).toHaveLength(1);
    const entry = { name: 'ada', role: 'view', hash: hashOf(found![0]!) };
    const lines = stdout.split('\n');
    expect(parse(lines.find((line) => line.startsWith('  - '))!)).toEqual([entry]);
    expect(readTokens(lines.find((line) => line.startsWith('  ada '))!)).toEqual([entry]);
  });

  it.each([
    [['--name', 'a b', '--role', 'view'], '--name is "a b"'],
    [['--name', 'ada', '--role', 'owner'], 'expected one of view, acknowledge, configure, feed'],
  ])('refuses %j', async (args, words) => {
    const { code, stderr } = await rockhour(['admit', ...args]);
    expect(code).toBe(2);
    expect(stderr).toContain(words);
  });
});
