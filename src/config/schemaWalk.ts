import { z } from 'zod';
import type { Path } from './faults.js';

export interface Note {
  readonly description?: string;
  readonly unit?: string;
  readonly examples?: readonly unknown[];
  readonly otherwise?: string;
  /** Words for the form of a text; a pattern tells an operator little. */
  readonly form?: string;
}

/** What a key says of itself; looks through default and optional down to where it was written. */
export function noteOf(schema: z.ZodType): Note {
  const own = (schema.meta() ?? {}) as Note;
  const inner = innerOf(schema);
  return inner === null ? own : { ...noteOf(inner), ...own };
}

function innerOf(schema: z.ZodType): z.ZodType | null {
  if (
    schema instanceof z.ZodDefault ||
    schema instanceof z.ZodPrefault ||
    schema instanceof z.ZodOptional
  ) {
    return schema.unwrap() as z.ZodType;
  }
  return null;
}

/** The schema below default, prefault and optional. */
export function bare(schema: z.ZodType): z.ZodType {
  const inner = innerOf(schema);
  return inner === null ? schema : bare(inner);
}

/** False where the key may be left out. */
export function isRequired(schema: z.ZodType): boolean {
  return innerOf(schema) === null;
}

/** The branch of a union that a value was meant for, null where it cannot be told. */
export function branchFor(union: z.ZodUnion, value: unknown): z.ZodType | null {
  const options = union.options as readonly z.ZodType[];
  if (union instanceof z.ZodDiscriminatedUnion) {
    const key = union.def.discriminator;
    const word = isBlock(value) ? value[key] : undefined;
    const fits = (option: z.ZodType) =>
      option instanceof z.ZodObject && (option.shape[key] as z.ZodType).safeParse(word).success;
    return options.find(fits) ?? null;
  }
  const wanted = isBlock(value)
    ? isBlockSchema
    : Array.isArray(value)
      ? isListSchema
      : isPlainSchema;
  const fitting = options.filter(wanted);
  return fitting.length === 1 ? fitting[0]! : null;
}

const isBlockSchema = (s: z.ZodType) =>
  s instanceof z.ZodObject || s instanceof z.ZodDiscriminatedUnion;
const isListSchema = (s: z.ZodType) => s instanceof z.ZodArray;
const isPlainSchema = (s: z.ZodType) => !isBlockSchema(s) && !isListSchema(s);

export function isBlock(value: unknown): value is Record<string, unknown> {
  return value !== null && typeof value === 'object' && !Array.isArray(value);
}

/** The value at a path, undefined where there is none. */
export function valueAt(root: unknown, path: Path): unknown {
  let value: unknown = root;
  for (const part of path) {
    if (value === null || typeof value !== 'object' || !Object.hasOwn(value, part))
      return undefined;
    value = (value as Record<string | number, unknown>)[part];
  }
  return value;
}

/** The schema that rules a path of given data; null where the path leads beyond the schema. */
export function schemaAt(root: z.ZodType, data: unknown, path: Path): z.ZodType | null {
  let schema: z.ZodType | null = root;
  for (let i = 0; i < path.length && schema !== null; i++) {
    const part = path[i]!;
    const here = settle(schema, valueAt(data, path.slice(0, i)));
    if (here instanceof z.ZodObject) schema = (here.shape[part] as z.ZodType | undefined) ?? null;
    else if (here instanceof z.ZodArray && typeof part === 'number')
      schema = here.element as z.ZodType;
    else schema = null;
  }
  return schema;
}

/** Looks through defaults and unions until a plain schema stands there. */
export function settle(schema: z.ZodType, value: unknown): z.ZodType {
  const here = bare(schema);
  if (here instanceof z.ZodUnion) {
    const branch = branchFor(here, value);
    return branch === null ? here : settle(branch, value);
  }
  return here;
}
