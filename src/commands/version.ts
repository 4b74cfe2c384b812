import { readFileSync } from 'node:fs';

export function packageVersion(): string {
  // Beside both src and dist.
  const text = readFileSync(new URL('../../package.json', import.meta.url), 'utf8');
  return (JSON.parse(text) as { version: string }).version;
}
