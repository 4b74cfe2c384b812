import { z } from 'zod';

/** What the reference and the editors' JSON Schema tell of a key; kept beside the key itself. */
export interface KeyNote {
  readonly description: string;
  /** Unit of the value, `-` where it has none. */
  readonly unit: string;
  readonly example: unknown;
  /** Words for a default that depends on other keys. */
  readonly otherwise?: string;
}

/** Attaches description, unit and example to a schema: the one place where a key is documented. */
export function key<T extends z.ZodType>(
  schema: T,
  unit: string,
  description: string,
  example: unknown,
  otherwise?: string,
): T {
  const note = { description, unit, examples: [example] };
  return schema.meta(otherwise === undefined ? note : { ...note, otherwise }) as T;
}

/** A section or list: its keys carry the units, so it has a description only. */
export function section<T extends z.ZodType>(
  schema: T,
  description: string,
  otherwise?: string,
): T {
  return schema.meta(otherwise === undefined ? { description } : { description, otherwise }) as T;
}

/**
 * Names that become column names of a recording, keys of the output and parts of topics, so
 * without spaces, commas, slashes or wildcards.
 */
export const ID_PATTERN = /^[A-Za-z][A-Za-z0-9_.-]{0,63}$/;
export const id = () =>
  worded(
    z.string().regex(ID_PATTERN),
    'a name that begins with a letter and holds at most 64 letters, digits, _ . -',
  );

/** Adds words for the form of a text: a pattern tells an operator little. */
export function worded<T extends z.ZodType>(schema: T, form: string): T {
  return schema.meta({ form }) as T;
}

/** Absolute zero excluded; above 1600 degC no filler of the trade is stable. */
export const temperature_degC = () => z.number().gt(-273.15).max(1600);

export const positive = (most: number) => z.number().gt(0).max(most);
export const share = () => z.number().min(0).max(1);
