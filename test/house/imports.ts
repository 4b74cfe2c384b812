import { readdirSync, readFileSync } from 'node:fs';
import { builtinModules } from 'node:module';
import { dirname, join, relative } from 'node:path';
import { fileURLToPath } from 'node:url';

export const root = fileURLToPath(new URL('../..', import.meta.url));

export interface Import {
  /** Path of the importing file from the top of the checkout. */
  readonly from: string;
  /** `src/...` without its ending for the project's own, the package name, or `node`. */
  readonly to: string;
  /** Leaves nothing in the compiled program. */
  readonly typeOnly: boolean;
}

/** All TypeScript files below a folder, as paths from the top of the checkout. */
export function sources(folder: string): string[] {
  return readdirSync(join(root, folder), { recursive: true, encoding: 'utf8' })
    .filter((name) => /\.(ts|tsx|mts)$/.test(name))
    .map((name) => join(folder, name))
    .sort();
}

/** A file's text without comments, so that an import named in one is none. */
export function code(file: string): string {
  const text = readFileSync(join(root, file), 'utf8');
  // Strings first, so that the // of a URL begins no comment.
  return text.replace(
    /('(?:\\.|[^'\\\n])*'|"(?:\\.|[^"\\\n])*"|`(?:\\.|[^`\\])*`)|\/\/[^\n]*|\/\*[\s\S]*?\*\//g,
    (_, text?: string) => text ?? ' ',
  );
}

const FROM = /\b(import|export)\s+(type\s+)?([\w$*{][^;'"]*?)\s*from\s*['"]([^'"]+)['"]/g;
// Not the option --import of node, which stands in strings.
const BARE = /(?<![-\w])import\s*\(?\s*['"]([^'"\n]+)['"]/g;
const REQUIRE = /\brequire\s*\(\s*['"]([^'"]+)['"]/g;

function onlyTypes(clause: string): boolean {
  const names = /^\{([\s\S]*)\}$/.exec(clause.trim())?.[1];
  if (names === undefined) return false;
  return names
    .split(',')
    .map((name) => name.trim())
    .filter(Boolean)
    .every((name) => name.startsWith('type '));
}

function target(file: string, specifier: string): string {
  if (specifier.startsWith('.')) {
    return relative(root, join(root, dirname(file), specifier)).replace(/\.(js|ts)$/, '');
  }
  if (specifier.startsWith('node:') || builtinModules.includes(specifier)) return 'node';
  const parts = specifier.split('/');
  return specifier.startsWith('@') ? parts.slice(0, 2).join('/') : (parts[0] ?? '');
}

/** Every import, re-export, dynamic import and require of a file. */
export function importsOf(file: string, text = code(file)): Import[] {
  const found: Import[] = [];
  for (const [, , type, clause, specifier] of text.matchAll(FROM)) {
    const typeOnly = type !== undefined || onlyTypes(clause ?? '');
    found.push({ from: file, to: target(file, specifier ?? ''), typeOnly });
  }
  for (const pattern of [BARE, REQUIRE]) {
    for (const [, specifier] of text.matchAll(pattern)) {
      found.push({ from: file, to: target(file, specifier ?? ''), typeOnly: false });
    }
  }
  return found;
}
