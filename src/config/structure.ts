import { z } from 'zod';
import { expectedWords } from './expected.js';
import { type Path, pathText, showValue } from './faults.js';
import { nearest } from './nearest.js';
import { bare, branchFor, isBlock, schemaAt, settle, valueAt } from './schemaWalk.js';

/** A fault before its line is known. */
export interface RawFault {
  readonly path: Path;
  /** True where the path ends in a key that should not be there. */
  readonly atKey: boolean;
  readonly found: string;
  readonly expected: string;
  readonly hint: string | null;
  /** For a key that should not be there: the free key that was probably meant. */
  readonly meant?: string | null;
}

type Issue = z.core.$ZodIssue;

/** Every structural fault of the data: unknown keys, missing keys, wrong kinds, values out of range. */
export function structureFaults(schema: z.ZodType, data: unknown): RawFault[] {
  const result = schema.safeParse(data);
  if (result.success) return [];
  const faults = result.error.issues.flatMap((issue) => faultsOf(schema, data, issue, []));
  // A misspelt key is one slip: that the right one is missing need not be said as well.
  const meant = new Set(
    faults.flatMap((f) =>
      typeof f.meant === 'string' ? [pathText([...f.path.slice(0, -1), f.meant])] : [],
    ),
  );
  // A value may miss two bounds of its range: one fault names the whole range.
  const seen = new Set<string>();
  return faults.filter((f) => {
    const place = pathText(f.path);
    if (seen.has(place) || (!f.atKey && meant.has(place))) return false;
    return seen.add(place);
  });
}

function faultsOf(root: z.ZodType, data: unknown, issue: Issue, prefix: Path): RawFault[] {
  const path = [...prefix, ...(issue.path as (string | number)[])];
  if (issue.code === 'unrecognized_keys') {
    return issue.keys.map((key) => unknownKey(root, data, path, key));
  }
  const schema = schemaAt(root, data, path);
  const value = valueAt(data, path);
  if (issue.code === 'invalid_union' && schema !== null) {
    const branches = unionIssues(schema, value, issue);
    if (branches !== null) return branches.flatMap((inner) => faultsOf(root, data, inner, path));
  }
  const words = discriminatorOptions(issue);
  return [
    {
      path,
      atKey: false,
      found: showValue(value, path),
      expected:
        words !== null
          ? `one of ${words.join(', ')}`
          : schema === null
            ? issue.message
            : expectedWords(schema),
      hint: words !== null ? nearHint(value, words) : valueHint(schema, value),
    },
  ];
}

/** The words that tell the branches of a union apart, where the data have none of them. */
function discriminatorOptions(issue: Issue): readonly string[] | null {
  if (issue.code !== 'invalid_union') return null;
  const { options } = issue as { options?: readonly unknown[] };
  return options === undefined ? null : options.map(String);
}

function nearHint(value: unknown, words: readonly string[]): string | null {
  const near = typeof value === 'string' ? nearest(value, words) : null;
  return near === null ? null : `did you mean ${near}?`;
}

/** The issues of the branch that was meant, null where the union as a whole is missed. */
function unionIssues(
  schema: z.ZodType,
  value: unknown,
  issue: Extract<Issue, { code: 'invalid_union' }>,
): readonly Issue[] | null {
  const union = bare(schema);
  if (!(union instanceof z.ZodUnion) || issue.errors.length === 0) return null;
  const branch = branchFor(union, value);
  const at = (union.options as readonly z.ZodType[]).indexOf(branch as z.ZodType);
  const issues = at < 0 ? undefined : (issue.errors[at] as readonly Issue[] | undefined);
  // A single word that is not in the list: the whole union says better what is possible.
  return issues === undefined ||
    issues.some((i) => i.path.length === 0 && i.code === 'invalid_value')
    ? null
    : issues;
}

function unknownKey(root: z.ZodType, data: unknown, path: Path, key: string): RawFault {
  const schema = schemaAt(root, data, path);
  const here = schema === null ? null : settle(schema, valueAt(data, path));
  const known = here instanceof z.ZodObject ? Object.keys(here.shape) : [];
  const block = valueAt(data, path);
  const free = known.filter((k) => !(isBlock(block) && Object.hasOwn(block, k)));
  const meant = nearest(key, free);
  const near = meant ?? nearest(key, known);
  const where = path.length === 0 ? 'at the top level' : `in ${pathText(path)}`;
  return {
    path: [...path, key],
    atKey: true,
    found: 'a key that is not known here',
    expected: known.length === 0 ? 'no such key' : `${where} the keys ${known.join(', ')}`,
    hint: keyHint(key, known, near),
    meant,
  };
}

function keyHint(key: string, known: readonly string[], near: string | null): string | null {
  if (/pass|secret|token/i.test(key)) {
    if (known.includes('tokens') || known.includes('hash')) {
      return 'secrets do not belong in this file: rockhour admit makes a token, of which the hash alone stands in http.tokens';
    }
    return known.includes('password_file')
      ? 'secrets do not belong in this file: name a file with password_file or an environment variable with password_env'
      : 'secrets do not belong in this file';
  }
  return near === null ? null : `did you mean ${near}?`;
}

function valueHint(schema: z.ZodType | null, value: unknown): string | null {
  if (schema === null) return null;
  const kind = bare(schema);
  if (typeof value === 'string') {
    const near = nearHint(value, wordsOf(kind));
    if (near !== null) return near;
    if (kind instanceof z.ZodNumber && /^[-+]?\d+,\d+$/.test(value)) {
      return 'decimals are written with a point';
    }
    if (kind instanceof z.ZodNumber && value.trim() !== '' && Number.isFinite(Number(value))) {
      return 'write the number without quotation marks';
    }
    if (kind instanceof z.ZodNumber && /^[-+]?\d/.test(value)) {
      return 'the unit is part of the key: write the bare number';
    }
  }
  if (
    kind instanceof z.ZodArray &&
    !Array.isArray(value) &&
    value !== undefined &&
    value !== null
  ) {
    return 'write a list: [first, second], or one line per entry beginning with -';
  }
  return null;
}

function wordsOf(schema: z.ZodType): string[] {
  if (schema instanceof z.ZodEnum) return schema.options.map(String);
  if (schema instanceof z.ZodLiteral) return [...schema.values].map(String);
  if (schema instanceof z.ZodDiscriminatedUnion) return [];
  if (schema instanceof z.ZodUnion) {
    return (schema.options as readonly z.ZodType[]).flatMap((o) => wordsOf(bare(o)));
  }
  return [];
}
