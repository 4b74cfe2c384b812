import { rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterEach, expect, it } from 'vitest';
import { Access } from '../../src/access/access.js';
import { hashOf } from '../../src/access/token.js';
import { TokensWatch } from '../../src/access/tokensWatch.js';
import { temporaryFolder } from '../support/folders.js';

let watch: TokensWatch | null = null;
afterEach(() => watch?.stop());

it('takes over what changes in the file, and goes on by those before where it has a fault', async () => {
  const file = join(temporaryFolder('tokens'), 'tokens');
  const inline = [{ name: 'chief', role: 'configure', hash: hashOf('0') }] as const;
  const line = (name: string, token: string) => `${name} view ${hashOf(token)}\n`;
  writeFileSync(file, line('ada', '1') + line('bob', '2'));
  const access = new Access([
    ...inline,
    { name: 'ada', role: 'view', hash: hashOf('1') },
    { name: 'bob', role: 'view', hash: hashOf('2') },
  ]);
  const [infos, errors]: string[][] = [[], []];
  watch = new TokensWatch({
    ...{ access, file, inline, every_ms: 5 },
    info: (text) => infos!.push(text),
    error: (text) => errors!.push(text),
  });
  watch.start();
  const known = () => ['0', '1', '2', '3'].filter((token) => access.holderOf(token) !== null);
  writeFileSync(file, line('ada', '1'));
  await expect.poll(known).toEqual(['0', '1']);
  writeFileSync(file, line('ada', '1') + line('eve', '3'));
  await expect.poll(known).toEqual(['0', '1', '3']);
  for (const fault of ['nonsense', '', line('chief', '5')]) {
    const before = errors!.length;
    writeFileSync(file, fault);
    await expect.poll(() => errors!.length).toBeGreaterThan(before);
  }
  rmSync(file);
  await expect.poll(() => errors!.at(-1)).toMatch(/cannot be read; the tokens of before go on$/);
  expect(known()).toEqual(['0', '1', '3']);
  expect(infos!.at(-1)).toMatch(/2 tokens taken over/);
});
