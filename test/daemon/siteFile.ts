import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { parse, stringify } from 'yaml';
import { temporaryFolder } from '../support/folders.js';

const DEMO = fileURLToPath(new URL('../../config/demo.yaml', import.meta.url));

/**
 * The demonstration's site file with other blocks, in a folder of its own.
 *
 * @param cells of its estimator: few where physics does not matter and questions should be quick
 * @param keys of its units that are to be others
 */
export function siteFile(
  blocks: Readonly<Record<string, object>>,
  cells?: number,
  keys: Readonly<Record<string, unknown>> = {},
): {
  readonly path: string;
  readonly folder: string;
} {
  const folder = temporaryFolder('site');
  const path = join(folder, 'site.yaml');
  const site = parse(readFileSync(DEMO, 'utf8')) as Record<string, object>;
  const few = cells === undefined ? {} : { estimator: { cells } };
  const units = (site.units as object[]).map((unit) => ({ ...unit, ...few, ...keys }));
  const own = { store: { folder: './data' }, http: { port: 0 }, ...blocks };
  writeFileSync(path, stringify({ ...site, units, ...own }));
  return { path, folder: join(folder, 'data') };
}
