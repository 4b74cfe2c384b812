import type { Figure } from './figure.js';

/** A row of the table: a scenario with one sensor set and error model. */
export interface Block {
  readonly scenario: string;
  readonly row: string;
  readonly title: string;
  readonly seeds: number;
  readonly figures: readonly Figure[];
}

const NAME = 46;

/** All blocks as one table; targets and marks beside the figures that have them. */
export function tableText(blocks: readonly Block[]): string {
  const lines: string[] = [
    `${'figure'.padEnd(NAME)}${'value'.padStart(9)} ${'unit'.padEnd(11)}${'target'.padEnd(14)}`,
  ];
  for (const block of blocks) {
    lines.push(
      '',
      `== ${block.title}${block.seeds > 0 ? ` (${block.seeds} seed${block.seeds === 1 ? '' : 's'})` : ``}`,
    );
    for (const f of block.figures) {
      const mark = f.met === null ? '' : f.met ? 'met' : 'MISSED';
      const start = `${f.name.padEnd(NAME)}${numberText(f.value).padStart(9)} ${f.unit.padEnd(11)}`;
      const end = f.note === '' ? '' : `  ${f.note}`;
      lines.push(`${start}${(f.target ?? '').padEnd(14)}${mark.padEnd(7)}${end}`.trimEnd());
    }
  }
  return `${lines.join('\n')}\n`;
}

function numberText(value: number | null): string {
  if (value === null || !Number.isFinite(value)) return '-';
  if (Number.isInteger(value)) return String(value);
  const size = Math.abs(value);
  return value.toFixed(size >= 100 ? 0 : size >= 10 ? 1 : size >= 1 ? 2 : 4);
}
