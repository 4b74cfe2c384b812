import { mkdirSync, readdirSync, rmSync, statSync, utimesSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';

export const root = fileURLToPath(new URL('../..', import.meta.url));
/** Truths, results and remembered seeds; not part of the project. */
export const folder = join(root, '.score');

/** Makes the folders of a kind and keeps the last few others of that kind that were used. */
export function keepFolders(
  kind: 'truth' | 'results' | 'watch',
  mine: readonly string[],
  others: number,
): void {
  const path = join(folder, kind);
  const now = new Date();
  for (const name of mine) {
    mkdirSync(join(path, name), { recursive: true });
    utimesSync(join(path, name), now, now);
  }
  const rest = readdirSync(path, { withFileTypes: true })
    .filter((entry) => entry.isDirectory() && !mine.includes(entry.name))
    .map((entry) => ({ name: entry.name, used: statSync(join(path, entry.name)).mtimeMs }))
    .sort((a, b) => b.used - a.used);
  for (const { name } of rest.slice(others)) {
    rmSync(join(path, name), { recursive: true, force: true });
  }
}
