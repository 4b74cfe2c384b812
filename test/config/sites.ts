import { readFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';
import { parse, stringify } from 'yaml';
import type { Fault } from '../../src/config/faults.js';
import { type Parsed, parseSite } from '../../src/config/load.js';
import type { SiteConfig } from '../../src/config/site.js';

export const CONFIG_FOLDER = fileURLToPath(new URL('../../config/', import.meta.url));
export const EXAMPLES = ['demo', 'hot-air', 'salt-thermocline'] as const;
export type Example = (typeof EXAMPLES)[number];

export function exampleText(name: Example): string {
  return readFileSync(`${CONFIG_FOLDER}${name}.yaml`, 'utf8');
}

/** The data of an example, freely changeable. Aliases are written out as separate values. */
export function exampleData(name: Example): Block {
  return structuredClone(JSON.parse(JSON.stringify(parse(exampleText(name))))) as Block;
}

// A test reaches into data whose shape it knows; a wrong path fails the test by itself.
// biome-ignore lint/suspicious/noExplicitAny: see above
export type Block = any;

export function parseData(data: unknown, environment: Record<string, string> = {}): Parsed {
  return parseSite(stringify(data, { aliasDuplicateObjects: false }), CONFIG_FOLDER, environment);
}

/** The site of an example after a change; throws with the faults where there are any. */
export function siteOf(name: Example, change: (data: Block) => void = () => {}): SiteConfig {
  const data = exampleData(name);
  change(data);
  const parsed = parseData(data);
  if (parsed.faults !== undefined) throw new Error(JSON.stringify(parsed.faults, null, 2));
  return parsed.site;
}

/** The faults of an example after a change; throws where it is still sound. */
export function faultsOf(name: Example, change: (data: Block) => void): readonly Fault[] {
  const data = exampleData(name);
  change(data);
  const parsed = parseData(data);
  if (parsed.faults === undefined) throw new Error('the changed site has no faults');
  return parsed.faults;
}
