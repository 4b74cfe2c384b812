import { readFileSync } from 'node:fs';
import { dirname, resolve } from 'node:path';
import { ConfigFault } from './faults.js';
import { parseSite } from './parse.js';
import type { SiteConfig } from './site.js';

export { ConfigFault, type Fault } from './faults.js';
export { type Parsed, parseSite } from './parse.js';

/** A site file is text that people write; one that is larger is something else. */
const MOST_BYTES = 4 * 1024 * 1024;

/** A site file as it was read: what a thread needs to come to the same configuration later. */
export interface SiteSource {
  readonly path: string;
  readonly text: string;
}

/** @throws ConfigFault where the file cannot be read */
export function readSource(path: string): SiteSource {
  return { path, text: readText(path) };
}

/** @throws ConfigFault with every fault of the text at once */
export function siteOf(source: SiteSource): SiteConfig {
  return parsed(source, false);
}

/**
 * The same for running: units with faults are left out and told in `left_out`.
 *
 * @throws ConfigFault where a fault lies outside the units, or no unit is sound
 */
export function runnableSiteOf(source: SiteSource): SiteConfig {
  return parsed(source, true);
}

function parsed({ path, text }: SiteSource, leavesOut: boolean): SiteConfig {
  const parsed = parseSite(text, dirname(resolve(path)), process.env, leavesOut);
  if (parsed.faults !== undefined) {
    throw new ConfigFault('CONFIG_INVALID', path, parsed.faults, parsed.more_may_follow);
  }
  return parsed.site;
}

/**
 * Reads a site file and gives its frozen configuration.
 *
 * @throws ConfigFault with every fault of the file at once, also where it cannot be read
 */
export function loadSite(path: string): SiteConfig {
  return siteOf(readSource(path));
}

function readText(path: string): string {
  const unreadable = (found: string): ConfigFault =>
    new ConfigFault(
      'CONFIG_UNREADABLE',
      path,
      [{ path: '(whole file)', line: null, found, expected: 'a site file in YAML', hint: null }],
      false,
    );
  let bytes: Buffer;
  try {
    bytes = readFileSync(path);
  } catch (error) {
    const { code } = error as NodeJS.ErrnoException;
    if (code === 'ENOENT') throw unreadable('no such file');
    if (code === 'EISDIR') throw unreadable('a folder');
    throw unreadable(`a file that cannot be read (${code ?? 'unknown error'})`);
  }
  if (bytes.length > MOST_BYTES) throw unreadable(`a file of ${bytes.length} bytes`);
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch {
    throw unreadable('bytes that are not UTF-8 text');
  }
}
