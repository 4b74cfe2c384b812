import { readFileSync } from 'node:fs';
import { fileURLToPath } from 'node:url';

/**
 * The text at the head of a tool's source: its first block comment, without the marks.
 * @throws RangeError where the source does not begin with one
 */
export function headText(source: string): string {
  const block = /^(?:#![^\n]*\n)?\/\*\*\n([\s\S]*?)\n? \*\//.exec(source)?.[1];
  if (block === undefined) throw new RangeError('source must begin with a block comment');
  return block
    .split('\n')
    .map((line) => line.replace(/^ \* ?/, ''))
    .join('\n');
}

/**
 * Where `--help` or `-h` is asked for, prints the text at the head of the tool and ends.
 * @param url `import.meta.url` of the tool
 */
export function helpIfAsked(url: string, args = process.argv.slice(2)): void {
  if (!args.includes('--help') && !args.includes('-h')) return;
  console.log(headText(readFileSync(fileURLToPath(url), 'utf8')));
  process.exit(0);
}
