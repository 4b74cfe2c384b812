import { execFile } from 'node:child_process';
import { promisify } from 'node:util';
import { describe, expect, it } from 'vitest';
import { headText } from '../../tools/help.js';

const run = promisify(execFile);

describe('the help of the tools', () => {
  it.each([
    ['tools/score.ts', ['npm run score', '--tuning', '--strict', '--truths-only']],
    ['tools/tuneScore.ts', ['rockhour tune', '--runs', '--workers', '--strict']],
    ['tools/watchScore.ts', ['npm run score:watch', '--trace', '--tuning', '--strict']],
    ['tools/bench.ts', ['npm run bench']],
  ])(
    '%s prints what stands at its head, and does nothing else',
    async (tool, words) => {
      for (const option of ['--help', '-h']) {
        const { stdout, stderr } = await run(process.execPath, ['--import', 'tsx', tool, option]);
        for (const word of words) expect(stdout).toContain(word);
        expect(stdout).not.toMatch(/\*\/|^ ?\*/m);
        expect(stderr).toBe('');
      }
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
