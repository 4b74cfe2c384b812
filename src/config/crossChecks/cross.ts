import { type Path, showValue } from '../faults.js';
import type { RawFault } from '../structure.js';

/** A fault between several keys. `about` names all keys that it was concluded from. */
export interface CrossFault extends RawFault {
  readonly about: readonly Path[];
}

/** A fault at `path`, concluded from the value there and those at `others`. */
export function cross(
  path: Path,
  found: unknown,
  expected: string,
  options: { readonly hint?: string; readonly others?: readonly Path[] } = {},
): CrossFault {
  return {
    path,
    atKey: false,
    found: showValue(found, path),
    expected,
    hint: options.hint ?? null,
    about: [path, ...(options.others ?? [])],
  };
}

/** Reports every repeated name at its second and later places, naming the first. */
export function repeated(
  entries: readonly { readonly name: string; readonly path: Path }[],
  what: string,
  pathWords: (path: Path) => string,
): CrossFault[] {
  const first = new Map<string, Path>();
  const faults: CrossFault[] = [];
  for (const { name, path } of entries) {
    const before = first.get(name);
    if (before === undefined) first.set(name, path);
    else {
      faults.push(
        cross(path, name, `${what} (already at ${pathWords(before)})`, { others: [before] }),
      );
    }
  }
  return faults;
}

/** Index of the first entry that is not above the one before it, -1 where the list ascends. */
export function firstNotAscending(values: readonly number[]): number {
  return values.findIndex((value, i) => i > 0 && !(value > values[i - 1]!));
}
