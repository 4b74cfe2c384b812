import { mkdirSync, readdirSync, rmSync, statSync, utimesSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';

export const root = fileURLToPath(new URL('../..', import.meta.url));
/** Truths, results and remembered seeds; not part of the project. */
export const folder = join(root, '.score');

/** Makes the folder of a kind and keeps the last few others of that kind that were used. */
export function keepFolders(kind: 'truth' | 'results', mine: string, others: number): void {
  const path = join(folder, kind);
  mkdirSync(join(path, mine), { recursive: true });
  const now = new Date();
  utimesSync(join(path, mine), now, now);
  const rest = readdirSync(path, { withFileTypes: true })
    .filter((entry) => entry.isDirectory() && entry.name !== mine)
    .map((entry) => ({ name: entry.name, used: statSync(join(path, entry.name)).mtimeMs }))
    .sort((a, b) => b.used - a.used);
  for (const { name } of rest.slice(others)) {
    rmSync(join(path, name), { recursive: true, force: true });
  }
}
