import { z } from 'zod';
import { siteSchema } from './schema/site.js';
import { bare, isRequired, noteOf } from './schemaWalk.js';

/** One key of the reference. */
export interface ReferenceEntry {
  /** `units[].stores[].bed.height_m`; a branch of a choice is named in brackets. */
  readonly path: string;
  readonly description: string;
  /** Empty for a section. */
  readonly unit: string;
  /** The default in words, `required` where there is none. */
  readonly default: string;
  readonly example: string;
  readonly isSection: boolean;
  /** What values it takes, for words of a closed list. */
  readonly choices: readonly string[];
}

/** Every key of a site file in the order of the schema. */
export function referenceEntries(): ReferenceEntry[] {
  return entriesOf(siteSchema, '');
}

function entriesOf(schema: z.ZodType, at: string): ReferenceEntry[] {
  const here = bare(schema);
  if (here instanceof z.ZodObject) {
    return Object.entries(here.shape).flatMap(([name, part]) => {
      const path = at === '' ? name : `${at}.${name}`;
      return [entryOf(part as z.ZodType, path), ...entriesOf(part as z.ZodType, path)];
    });
  }
  if (here instanceof z.ZodArray) return entriesOf(here.element as z.ZodType, `${at}[]`);
  if (here instanceof z.ZodUnion) {
    return (here.options as readonly z.ZodType[]).flatMap((option) =>
      entriesOf(option, `${at}${branchName(here, option)}`),
    );
  }
  return [];
}

/** `(gas_cycle)`: the word that chooses this branch. */
function branchName(union: z.ZodUnion, option: z.ZodType): string {
  const block = bare(option);
  if (!(block instanceof z.ZodObject)) return '';
  const keys =
    union instanceof z.ZodDiscriminatedUnion ? [union.def.discriminator] : Object.keys(block.shape);
  for (const key of keys) {
    const literal = block.shape[key];
    if (literal instanceof z.ZodLiteral) return `(${[...literal.values].join(', ')})`;
  }
  return '';
}

function entryOf(schema: z.ZodType, path: string): ReferenceEntry {
  const note = noteOf(schema);
  const isSection = note.unit === undefined;
  return {
    path,
    description: note.description ?? '',
    unit: note.unit ?? '',
    default: defaultWords(schema),
    example: note.examples === undefined ? '' : inline(note.examples[0]),
    isSection,
    choices: choicesOf(bare(schema)),
  };
}

function defaultWords(schema: z.ZodType): string {
  if (isRequired(schema)) return 'required';
  const { otherwise } = noteOf(schema);
  if (otherwise !== undefined) return otherwise;
  if (schema instanceof z.ZodDefault) return inline(schema.def.defaultValue);
  return schema instanceof z.ZodPrefault ? 'the defaults below' : 'none';
}

function choicesOf(schema: z.ZodType): string[] {
  if (schema instanceof z.ZodEnum) return schema.options.map(String);
  if (schema instanceof z.ZodLiteral) return [...schema.values].map(String);
  if (schema instanceof z.ZodUnion && !(schema instanceof z.ZodDiscriminatedUnion)) {
    return (schema.options as readonly z.ZodType[]).flatMap((option) => choicesOf(bare(option)));
  }
  return [];
}

function inline(value: unknown): string {
  if (typeof value === 'string') return value === '' ? '""' : value;
  return JSON.stringify(value);
}

const INTRODUCTION = `# Keys of a site file

Made by \`rockhour check --explain\` from the schema that rockhour reads a site file with; do not
edit. Units are part of the keys. A key without a default is required. Keys that are not listed
here are refused. \`[]\` stands for each entry of a list; a word in brackets, as in
\`machine(gas_cycle)\`, for the branch that this word chooses. Relative paths are taken from the
folder of the site file. Passwords never stand in it.
`;

/** The reference of all keys in Markdown: one table per section. */
export function referenceText(): string {
  const groups = new Map<string, ReferenceEntry[]>();
  for (const entry of referenceEntries()) {
    const section = entry.path.slice(0, Math.max(0, entry.path.lastIndexOf('.')));
    groups.set(section, [...(groups.get(section) ?? []), entry]);
  }
  const described = new Map(referenceEntries().map((entry) => [entry.path, entry.description]));
  const parts = [INTRODUCTION];
  for (const [section, entries] of groups) {
    const title = section === '' ? 'Top level' : `\`${section}\``;
    const words =
      described.get(section) ?? described.get(section.replace(/(\[\]|\([^)]*\))+$/, ''));
    const about = words === undefined || words === '' ? '' : `\n${words}\n`;
    parts.push(`## ${title}\n${about}\n${tableOf(entries)}`);
  }
  return `${parts.join('\n')}`;
}

function tableOf(entries: readonly ReferenceEntry[]): string {
  const rows = entries.map((entry) => {
    const name = entry.path.slice(entry.path.lastIndexOf('.') + 1);
    const choices =
      entry.choices.length > 1 ? ` One of ${entry.choices.map((c) => `\`${c}\``).join(', ')}.` : '';
    const unit = entry.isSection ? 'block' : entry.unit;
    const code = (text: string) => (text === '' ? '' : `\`${text}\``);
    const standard =
      ['required', 'none'].includes(entry.default) || / /.test(entry.default)
        ? entry.default
        : code(entry.default);
    return `| \`${name}\` | ${unit} | ${standard} | ${code(entry.example)} | ${entry.description}${choices} |`.replaceAll(
      '\n',
      ' ',
    );
  });
  return [
    '| key | unit | default | example | what it is |',
    '|---|---|---|---|---|',
    ...rows,
    '',
  ].join('\n');
}
