import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join, relative } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { codeHash } from '../../tools/score/codeHash.js';
import { root } from '../../tools/score/folder.js';

const folder = mkdtempSync(join(tmpdir(), 'rockhour-code-hash-'));
afterAll(() => rmSync(folder, { recursive: true }));

function hashOf(main: string, other: string): Promise<string> {
  writeFileSync(join(folder, 'other.ts'), other);
  writeFileSync(join(folder, 'main.ts'), main);
  return codeHash(relative(root, join(folder, 'main.ts')));
}

const MAIN = `import { half } from './other.js';\nexport const third = (x: number) => half(x) / 1.5;\n`;
const OTHER = 'export const half = (x: number) => x / 2;\n';

describe('the hash of code', () => {
  it('follows what a module does and what it reaches, and nothing else', async () => {
    const plain = await hashOf(MAIN, OTHER);
    expect(await hashOf(MAIN, OTHER)).toBe(plain);
    const words = `/** In two. */\n${OTHER}// More to come.\nexport type Half = number;\n`;
    expect(await hashOf(MAIN, words)).toBe(plain);
    expect(await hashOf(MAIN, `${OTHER}export const other = () => 3;\n`)).toBe(plain);
    expect(await hashOf(MAIN, OTHER.replace('x / 2', 'x / 2.5'))).not.toBe(plain);
    expect(await hashOf(MAIN.replace('1.5', '1.6'), OTHER)).not.toBe(plain);
  });
});
