import { z } from 'zod';
import { type Path, pathText } from './faults.js';
import { nearest } from './nearest.js';
import { bare, isBlock, isRequired, noteOf, schemaAt, settle, valueAt } from './schemaWalk.js';
import { type RawFault, structureFaults } from './structure.js';

/**
 * Makes faulty data whole, so that the checks between keys can run beside the structural ones and
 * an operator sees all faults in one go: keys that do not belong are dropped, optional ones fall
 * back to their default, and required ones take the example of the reference. `invented` names
 * every place that was touched; whatever is concluded from there is not to be reported.
 */
export function repair(
  schema: z.ZodType,
  data: unknown,
  faults: readonly RawFault[],
): { readonly data: unknown; readonly invented: readonly Path[] } | null {
  const copy: unknown = structuredClone(data);
  const invented: Path[] = [];
  let open: readonly RawFault[] = faults;
  // A repaired block may show faults below it that were hidden before; each round goes deeper.
  for (let round = 0; round < 8 && open.length > 0; round++) {
    // From the end of the file, so that dropping an entry of a list moves no fault before it.
    for (const fault of [...open].reverse()) {
      if (!mend(schema, copy, fault, invented)) return null;
    }
    open = structureFaults(schema, copy);
  }
  return open.length === 0 ? { data: copy, invented } : null;
}

function mend(schema: z.ZodType, root: unknown, fault: RawFault, invented: Path[]): boolean {
  const last = fault.path.at(-1);
  const parentPath = fault.path.slice(0, -1);
  const parent = valueAt(root, parentPath);
  if (last === undefined || parent === null || typeof parent !== 'object') return false;
  if (fault.atKey) {
    if (typeof fault.meant === 'string' && isBlock(parent)) parent[fault.meant] = parent[last];
    return Reflect.deleteProperty(parent, last);
  }
  const chooser = choosing(schema, root, parentPath, last);
  if (chooser !== null) {
    // Which branch was meant is a guess, so the whole block is no ground for conclusions.
    invented.push(parentPath);
    return Reflect.set(parent, last, chooser);
  }
  invented.push(fault.path);
  const rule = schemaAt(schema, root, fault.path);
  if (rule === null) return false;
  if (!isRequired(rule) && isBlock(parent)) return Reflect.deleteProperty(parent, last);
  const example = noteOf(rule).examples?.[0];
  if (example === undefined || bare(rule).safeParse(example).success === false) return false;
  return Reflect.set(parent, last, structuredClone(example));
}

/** A word that chooses a branch, where the faulty key is the one that should; else null. */
function choosing(schema: z.ZodType, root: unknown, block: Path, key: string | number): unknown {
  const rule = schemaAt(schema, root, block);
  if (rule === null) return null;
  const union = settle(rule, valueAt(root, block));
  if (!(union instanceof z.ZodDiscriminatedUnion) || union.def.discriminator !== key) return null;
  const words = (union.options as readonly z.ZodObject[]).flatMap((option) => {
    const literal = option.shape[key];
    return literal instanceof z.ZodLiteral ? [...literal.values].map(String) : [];
  });
  const found = valueAt(root, [...block, key]);
  return (typeof found === 'string' ? nearest(found, words) : null) ?? words[0] ?? null;
}

/** True where a conclusion rests on a place that was invented. */
export function restsOn(about: readonly Path[], invented: readonly Path[]): boolean {
  return about.some((a) => invented.some((b) => within(a, b) || within(b, a)));
}

function within(inner: Path, outer: Path): boolean {
  return inner.length >= outer.length && pathText(inner.slice(0, outer.length)) === pathText(outer);
}
