import { readFileSync } from 'node:fs';
import { dirname, resolve } from 'node:path';
import { isMap, isSeq, parseDocument, type YAMLMap, type YAMLSeq } from 'yaml';
import type { Fault } from './faults.js';
import { parseSite } from './parse.js';

/**
 * A site file with a fragment laid over it: keys of the fragment win, entries of lists are found by
 * their `id`. Comments and order of the file stay.
 *
 * @throws RangeError where the fragment names a unit or store that the file does not have
 */
export function mergeFragment(site: string, fragment: string): string {
  const document = parseDocument(site);
  lay(document.contents as YAMLMap, parseDocument(fragment).toJS(), '');
  return document.toString({ lineWidth: 0 });
}

function lay(onto: YAMLMap, over: Readonly<Record<string, unknown>>, path: string): void {
  for (const [key, value] of Object.entries(over)) {
    const there = onto.get(key, true);
    const at = path === '' ? key : `${path}.${key}`;
    if (Array.isArray(value) && isSeq(there)) layList(there as YAMLSeq, value, at);
    else if (isMap(there) && typeof value === 'object' && value !== null) {
      lay(there as YAMLMap, value as Record<string, unknown>, at);
    } else onto.set(key, value);
  }
}

function layList(onto: YAMLSeq, over: readonly unknown[], path: string): void {
  for (const entry of over as readonly Record<string, unknown>[]) {
    const own = onto.items.find((item) => isMap(item) && item.get('id') === entry.id);
    if (own === undefined) throw new RangeError(`${path}: there is no id ${String(entry.id)}`);
    lay(own as YAMLMap, entry, `${path}[${String(entry.id)}]`);
  }
}

/** Faults that a site file would have with a fragment laid over it; none = it can be taken over. */
export function fragmentFaults(path: string, fragment: string): readonly Fault[] {
  const merged = mergeFragment(readFileSync(path, 'utf8'), fragment);
  return parseSite(merged, dirname(resolve(path))).faults ?? [];
}
