import { LineCounter, parseDocument, type YAMLError } from 'yaml';
import { crossFaults } from './crossChecks/index.js';
import { type Fault, pathText } from './faults.js';
import { deepFreeze } from './freeze.js';
import { leaveOut } from './leaveOut.js';
import { lineOf } from './locate.js';
import { repair, restsOn } from './repair.js';
import { resolveSite } from './resolve.js';
import { type SiteBlock, siteSchema, unitSchema } from './schema/site.js';
import { readSecrets, type SecretFault, type Secrets } from './secrets.js';
import type { LeftOutUnit, SiteConfig } from './site.js';
import { type RawFault, structureFaults } from './structure.js';

export type Parsed =
  | { readonly site: SiteConfig; readonly faults?: never }
  | {
      readonly faults: readonly Fault[];
      /** True where the file is so broken that contradictions between keys could not be looked for. */
      readonly more_may_follow: boolean;
      readonly site?: never;
    };

type Environment = Readonly<Record<string, string | undefined>>;

/** What is found in the data of a site file. */
type Judged =
  | { readonly block: SiteBlock; readonly secrets: Secrets; readonly faults: readonly [] }
  | { readonly faults: readonly RawFault[]; readonly more_may_follow: boolean };

/**
 * A site file's text becomes a frozen SiteConfig, or every fault of it at once, in the order of
 * the file. Relative paths in it are taken from `baseFolder`; passwords come from files or from
 * `environment`. It throws for no text whatever.
 *
 * @param leavesOut where all faults lie within some of its units, a site of the others, which tells
 *   those that were left out
 */
export function parseSite(
  text: string,
  baseFolder: string,
  environment: Environment = process.env,
  leavesOut = false,
): Parsed {
  const lines = new LineCounter();
  const document = parseDocument(text, { lineCounter: lines, prettyErrors: false });
  if (document.errors.length > 0) {
    return {
      faults: firstCauses(document.errors, lines).map((error) => yamlFault(error, lines)),
      more_may_follow: true,
    };
  }
  let data: unknown;
  try {
    data = document.toJS();
  } catch {
    // Aliases that expand without end are the only way here; the text may hold a secret.
    return { faults: [wholeFile('aliases (*) that cannot be followed')], more_may_follow: true };
  }
  const located = (raw: readonly RawFault[]): Fault[] =>
    raw
      .map((fault) => ({
        path: pathText(fault.path),
        line: lineOf(document, lines, fault.path),
        found: fault.found,
        expected: fault.expected,
        hint: fault.hint,
      }))
      .sort((a, b) => (a.line ?? 0) - (b.line ?? 0));

  const judged = judge(data, baseFolder, environment);
  if ('block' in judged) {
    return { site: deepFreeze(resolveSite(judged.block, baseFolder, judged.secrets)) };
  }
  const { faults, more_may_follow } = judged;
  const rest = leavesOut
    ? leaveOut(data, (one) => judge(one, baseFolder, environment).faults)
    : null;
  const sound = rest && judge(rest.data, baseFolder, environment);
  if (!rest || !sound || !('block' in sound)) return { faults: located(faults), more_may_follow };
  const site = resolveSite(sound.block, baseFolder, sound.secrets);
  const taken = new Set(site.units.map(({ id }) => id));
  const left_out = rest.faulty.map((unit): LeftOutUnit => {
    const named = namedOf(data, unit.place, taken);
    taken.add(named.id);
    return { ...named, faults: located(unit.faults) };
  });
  return { site: deepFreeze({ ...site, left_out }) };
}

function judge(data: unknown, baseFolder: string, environment: Environment): Judged {
  const structural = structureFaults(siteSchema, data);
  const sound = siteSchema.safeParse(data);
  if (!sound.success) {
    const mended = repair(siteSchema, data, structural);
    if (mended === null) return { faults: structural, more_may_follow: true };
    const block = siteSchema.parse(mended.data);
    const concluded = crossFaults(block).filter((f) => !restsOn(f.about, mended.invented));
    const unread = readSecrets(block, baseFolder, environment)
      .faults.filter((f) => !restsOn([f.path], mended.invented))
      .map(asRaw);
    return { faults: [...structural, ...concluded, ...unread], more_may_follow: false };
  }
  const block: SiteBlock = sound.data;
  const { secrets, faults: secretFaults } = readSecrets(block, baseFolder, environment);
  const faults = [...crossFaults(block), ...secretFaults.map(asRaw)];
  return faults.length > 0
    ? { faults, more_may_follow: false }
    : { block, secrets, faults: [] as const };
}

/** Id and name of a unit of which anything may be wrong; its place where its id is none, or another's. */
function namedOf(
  data: unknown,
  place: number,
  taken: ReadonlySet<string>,
): { readonly id: string; readonly name: string } {
  const block = (data as { units: unknown[] }).units[place] as { id?: unknown; name?: unknown };
  const own = unitSchema.shape.id.safeParse(block?.id);
  const id = own.success && !taken.has(own.data) ? own.data : `units[${place}]`;
  const name = unitSchema.shape.name.safeParse(block?.name);
  return { id, name: (name.success ? name.data : undefined) ?? id };
}

function asRaw(fault: SecretFault): RawFault {
  return { ...fault, atKey: false, hint: null };
}

/** One error a line, and tabs alone where there are any: what follows from them is not a fault. */
function firstCauses(errors: readonly YAMLError[], lines: LineCounter): YAMLError[] {
  const tabs = errors.filter(({ code }) => code === 'TAB_AS_INDENT');
  const causes = tabs.length > 0 ? tabs : errors;
  const lineOfError = (error: YAMLError) => lines.linePos(error.pos[0]).line;
  return causes.filter((one, i) => i === 0 || lineOfError(one) !== lineOfError(causes[i - 1]!));
}

function wholeFile(found: string): Fault {
  return { path: '(whole file)', line: null, found, expected: 'YAML that can be read', hint: null };
}

/** The parser's own messages may quote the file, so they are put in words without it. */
const YAML_WORDS: Readonly<Record<string, readonly [found: string, hint: string | null]>> = {
  DUPLICATE_KEY: ['a key that stands here twice', 'keep one of the two'],
  TAB_AS_INDENT: ['a tab at the beginning of a line', 'YAML is indented with spaces'],
  BAD_INDENT: ['a line that is indented wrongly', 'keys of one block begin in the same column'],
  MISSING_CHAR: ['a missing character', 'a quotation mark, bracket or comma is not closed'],
  BLOCK_AS_IMPLICIT_KEY: ['two keys on one line', 'each key begins a line'],
  MULTILINE_IMPLICIT_KEY: ['a line without its key', 'write key: value'],
  BAD_ALIAS: [
    'an alias (*) without its anchor',
    'put a text that begins with * in quotation marks',
  ],
  MULTIPLE_DOCS: ['more than one document', 'a site is one document: remove the line ---'],
};

function yamlFault(error: YAMLError, lines: LineCounter): Fault {
  const [found, hint] = YAML_WORDS[error.code] ?? [
    `YAML that cannot be read (${error.code.toLowerCase().replaceAll('_', ' ')})`,
    null,
  ];
  const line = lines.linePos(error.pos[0]).line;
  return { path: '(whole file)', line, found, expected: 'YAML that can be read', hint };
}
