import { RockhourError } from '../errors.js';

/** One thing that is wrong with a configuration, in words. */
export interface Fault {
  /** Where: `units[0].stores[1].bed.void_fraction`. */
  readonly path: string;
  /** Line of the file, counted from 1; null where it cannot be told. */
  readonly line: number | null;
  /** The value found, shortened; never a secret. */
  readonly found: string;
  readonly expected: string;
  readonly hint: string | null;
}

export type Path = readonly (string | number)[];

/** Thrown by loadSite: carries every fault of the file at once. */
export class ConfigFault extends RockhourError {
  constructor(
    code: 'CONFIG_INVALID' | 'CONFIG_UNREADABLE',
    readonly file: string,
    readonly faults: readonly Fault[],
    readonly more_may_follow: boolean,
  ) {
    super(code, faultsAsText(file, faults, more_may_follow));
  }
}

export function pathText(path: Path): string {
  let text = '';
  for (const part of path) {
    if (typeof part === 'number') text += `[${part}]`;
    else text += text === '' ? part : `.${part}`;
  }
  return text === '' ? '(whole file)' : text;
}

/** Keys whose values are never shown, wherever they stand and however they are spelled. */
const SECRET_KEY = /pass|passwd|pwd|secret|token|credential|api_?key/i;

/** The value found at a path as a person would write it, shortened, secrets left out. */
export function showValue(value: unknown, path: Path): string {
  if (path.some((part) => typeof part === 'string' && SECRET_KEY.test(part))) {
    return value === undefined ? 'nothing' : 'a value (not shown)';
  }
  if (value === undefined) return 'nothing';
  if (value === null) return 'nothing (an empty value)';
  if (typeof value === 'number') return String(value);
  if (typeof value === 'string') {
    const shown = path.at(-1) === 'url' ? value.replace(/^.*@/s, '(login not shown)@') : value;
    return shorten(`the text "${withoutLogin(shown)}"`);
  }
  if (typeof value === 'boolean') return `the truth value ${value}`;
  if (Array.isArray(value)) return `a list of ${value.length}`;
  if (typeof value === 'object') {
    // Values of a block are not shown: one of them may be a secret under any key.
    const keys = Object.keys(value);
    return shorten(keys.length === 0 ? 'an empty block' : `a block with ${keys.join(', ')}`);
  }
  return shorten(String(value));
}

/** Name and password in front of an @ in an address. */
function withoutLogin(text: string): string {
  return text.replace(/:\/\/.*@/s, '://(login not shown)@');
}

function shorten(text: string): string {
  // A control character would let a file write on the operator's terminal.
  const plain = text.replace(/\p{Cc}/gu, ' ');
  return plain.length > 100 ? `${plain.slice(0, 97)}...` : plain;
}

/** The faults as a person reads them, in the order of the file. */
export function faultsAsText(
  file: string,
  faults: readonly Fault[],
  more_may_follow = false,
): string {
  const count = faults.length === 1 ? '1 fault' : `${faults.length} faults`;
  const lines = [`${file}: ${count}`];
  for (const fault of faults) {
    const where = fault.line === null ? '' : `line ${fault.line}: `;
    lines.push('', `  ${where}${fault.path}`);
    lines.push(`    found     ${fault.found}`, `    expected  ${fault.expected}`);
    if (fault.hint !== null) lines.push(`    hint      ${fault.hint}`);
  }
  if (more_may_follow) {
    lines.push(
      '',
      '  With these, contradictions between keys could not be looked for: more may follow.',
    );
  }
  return lines.join('\n');
}
