import { execFile } from 'node:child_process';
import { promisify } from 'node:util';
import { describe, expect, it } from 'vitest';
import { headText } from '../../tools/help.js';

const run = promisify(execFile);

describe('the help of the tools', () => {
  // Both options go through helpIfAsked: two tools are asked by the one, two by the other.
  it.each([
    ['tools/score.ts', '--help', ['npm run score', '--tuning', '--strict', '--truths-only']],
    ['tools/tuneScore.ts', '-h', ['rockhour tune', '--runs', '--workers', '--strict']],
    ['tools/watchScore.ts', '--help', ['npm run score:watch', '--trace', '--tuning', '--strict']],
    ['tools/bench.ts', '-h', ['npm run bench']],
  ])(
    '%s %s prints what stands at its head, and does nothing else',
    async (tool, option, words) => {
      const { stdout, stderr } = await run(process.execPath, ['--import', 'tsx', tool, option]);
      for (const word of words) expect(stdout).toContain(word);
      expect(stdout).not.toMatch(/\*\/|^ ?\*/m);
      expect(stderr).toBe('');
    },
    60_000,
  );

  it('is the first block comment of a source, and nothing where that is missing', () => {
    expect(headText('/**\n * One.\n *\n *   two --three\n */\nconst a = 1; /** no */\n')).toBe(
      'One.\n\n  two --three',
    );
    expect(() => headText('const a = 1;\n/**\n * Not at the head.\n */\n')).toThrow(RangeError);
  });
});
