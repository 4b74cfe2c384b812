import type { Mode } from '../../../core/definitions.js';

/** One row of a schedule as it was typed or pasted; times are as the server takes them. */
export interface TypedBlock {
  /** Of the text, from 1. */
  readonly line: number;
  readonly mode: Mode;
  readonly power_MW_el: number;
  readonly from: string;
  readonly to: string;
}

export interface LineFault {
  readonly line: number;
  readonly words: string;
}

export interface TypedSchedule {
  readonly blocks: readonly TypedBlock[];
  readonly faults: readonly LineFault[];
}

const TIMED =
  /^(\d{4})-(\d\d)-(\d\d)[T ](\d\d?):(\d\d)(?::(\d\d)(?:[.,]\d+)?)?\s?(Z|[+-]\d\d:?\d\d)?$/i;
const DAY_FIRST = /^(\d\d?)\.(\d\d?)\.(\d{4}),? (\d\d?):(\d\d)(?::(\d\d))?$/;
const CLOCK = /^(\d\d?):(\d\d)(?::(\d\d))?$/;
const NUMBER = /^[+\-−]?(\d+([.,]\d*)?|[.,]\d+)$/;
const MODES: Readonly<Record<string, Mode>> = {
  charge: 'charge',
  discharge: 'discharge',
  stand: 'stand',
};
const HEADS: Readonly<Record<string, string>> = {
  from: 'from',
  start: 'from',
  begin: 'from',
  to: 'to',
  end: 'to',
  until: 'to',
  mode: 'mode',
  power_mw_el: 'power',
  power_mw: 'power',
  power: 'power',
  mw: 'power',
  mw_el: 'power',
};
/** Whether a time was typed with Z or an offset, and so is an instant without a zone. */
export const hasOffset = (time: string): boolean => /(Z|[+-]\d\d:?\d\d)$/i.test(time.slice(16));

type Column = 'from' | 'to' | 'mode' | 'power';

const TIME_HELP = 'such as 2026-01-31 18:00, 31.01.2026 18:00 or 18:00';

/**
 * Reads rows `from, to, MW` or `from, to, mode, MW` as they are typed, pasted from a spreadsheet or
 * written as CSV: tabs, semicolons or commas between the fields, decimal point or comma, with a
 * header or without. A power above 0 without a mode discharges, one below 0 charges, 0 stands. A time
 * of day alone is of the day of the row before, or of the next where it would go back.
 *
 * @param today day that a first time of day is of, in the zone of the connection (YYYY-MM-DD)
 * @param now time of day now, HH:MM: an earlier one alone is of the next day
 */
export function readSchedule(text: string, today: string, now: string): TypedSchedule {
  const blocks: TypedBlock[] = [];
  const faults: LineFault[] = [];
  let columns: Column[] | null = null;
  let last = `${today}T${now}`;
  let first = true;
  const lines = text.replace(/^\ufeff/, '').split(/\r?\n/);
  for (const [i, written] of lines.entries()) {
    const line = i + 1;
    if (written.trim() === '' || written.trim().startsWith('#')) continue;
    const fields = fieldsOf(written);
    if (first) {
      first = false;
      const named = fields.map((field) => HEADS[field.toLowerCase()]);
      if (named.includes('from') && named.includes('to')) {
        columns = named as Column[];
        continue;
      }
      if (fields.some((field) => HEADS[field.toLowerCase()] !== undefined)) {
        const words = 'a header needs the columns from and to, beside power_MW_el or mode';
        faults.push({ line, words });
        continue;
      }
    }
    const read = rowOf(fields, columns, last);
    if ('words' in read) faults.push({ line, words: read.words });
    else {
      blocks.push({ line, ...read });
      if (!hasOffset(read.to)) last = read.to;
    }
  }
  if (faults.length === 0) faults.push(...overlaps(blocks));
  return { blocks, faults };
}

const DATE = /^(\d{4}-\d\d-\d\d|\d\d?\.\d\d?\.\d{4},?)$/;
const isTime = (text: string): boolean =>
  TIMED.test(text) || DAY_FIRST.test(text) || CLOCK.test(text);
const bare = (field: string): string =>
  field
    .trim()
    .replace(/^"(.*)"$/, '$1')
    .trim();

/** Tabs rule, then semicolons, then blanks where two times begin the row, else commas. */
function fieldsOf(line: string): string[] {
  if (line.includes('\t')) return line.split('\t').map(bare);
  if (line.includes(';')) return line.split(';').map(bare);
  const words = blanksOf(line);
  if (words.length >= 3 && words.slice(0, 2).every(isTime)) return words;
  const fields = line.split(',').map(bare);
  // `18:00, 20:00, 1,5`: two last fields of digits alone are one number.
  const [whole, part] = fields.slice(-2);
  const decimal =
    fields.length >= 4 && /^[+\-−]?\d+$/.test(whole ?? '') && /^\d+$/.test(part ?? '');
  return decimal ? [...fields.slice(0, -2), `${whole}.${part}`] : fields;
}

/** Words between blanks; a date and the time of day behind it are one. */
function blanksOf(line: string): string[] {
  const words: string[] = [];
  for (const word of line.trim().split(/\s+/)) {
    const before = words.at(-1);
    if (before !== undefined && DATE.test(before)) words[words.length - 1] = `${before} ${word}`;
    else words.push(word);
  }
  return words;
}

function rowOf(
  fields: readonly string[],
  columns: readonly Column[] | null,
  last: string,
): Omit<TypedBlock, 'line'> | { words: string } {
  const given = columns === null ? unnamed(fields) : named(fields, columns);
  if ('words' in given) return given;
  const from = timeOf(given.from, last);
  if (from === null) return { words: `“${given.from}” is no time to begin at; ${TIME_HELP}` };
  const to = timeOf(given.to, from);
  if (to === null) return { words: `“${given.to}” is no time to end at; ${TIME_HELP}` };
  const word = given.mode.toLowerCase();
  const mode = MODES[word];
  if (word !== '' && mode === undefined) {
    return { words: `“${given.mode}” is no mode; charge, discharge or stand` };
  }
  const empty = given.power === '';
  if (!empty && !NUMBER.test(given.power)) {
    return { words: `“${given.power}” is no power in MW; such as 1.8 or 1,8` };
  }
  const signed = empty ? 0 : Number(given.power.replace('−', '-').replace(',', '.'));
  const meant = mode ?? (signed > 0 ? 'discharge' : signed < 0 ? 'charge' : 'stand');
  if (empty && meant !== 'stand') return { words: `a ${meant} needs its power in MW` };
  if (mode === undefined && empty) return { words: 'the power in MW is missing; 0 stands' };
  if (mode !== undefined && signed < 0 && mode !== 'charge') {
    return { words: `a ${mode} has no power below 0; the mode tells the direction` };
  }
  if (meant === 'stand' && signed !== 0) return { words: 'a stand has no power; 0 or nothing' };
  const local = ![from, to].some(hasOffset);
  if (local && to <= from) return { words: `it ends at ${show(to)}, not after it begins` };
  return { mode: meant, power_MW_el: Math.abs(signed), from, to };
}

interface Written {
  readonly from: string;
  readonly to: string;
  readonly mode: string;
  readonly power: string;
}

function named(fields: readonly string[], columns: readonly Column[]): Written {
  const of = (column: Column): string => fields[columns.indexOf(column)] ?? '';
  return { from: of('from'), to: of('to'), mode: of('mode'), power: of('power') };
}

/** Without a header: from, to, MW, or with the mode before or behind the power. */
function unnamed(fields: readonly string[]): Written | { words: string } {
  const [from = '', to = '', third = '', fourth = ''] = fields;
  if (fields.length < 3 || fields.length > 4) {
    return {
      words: `${fields.length} ${fields.length === 1 ? 'field' : 'fields'}; a row is: from, to, MW`,
    };
  }
  if (fields.length === 4) {
    return MODES[fourth.toLowerCase()] !== undefined
      ? { from, to, mode: fourth, power: third }
      : { from, to, mode: third, power: fourth };
  }
  return MODES[third.toLowerCase()] === undefined
    ? { from, to, mode: '', power: third }
    : { from, to, mode: third, power: '' };
}

const two = (value: string | number): string => String(value).padStart(2, '0');

/** ISO 8601, local where no offset was given; null where it is no time. */
function timeOf(text: string, last: string): string | null {
  const iso = TIMED.exec(text);
  if (iso !== null) {
    const [, year, month, day, hour, minute, second, offset] = iso;
    return whole(year!, month!, day!, hour!, minute!, second, offsetOf(offset));
  }
  const dayFirst = DAY_FIRST.exec(text);
  if (dayFirst !== null) {
    const [, day, month, year, hour, minute, second] = dayFirst;
    return whole(year!, month!, day!, hour!, minute!, second);
  }
  const clock = CLOCK.exec(text);
  if (clock === null) return null;
  const [, hour, minute, second] = clock;
  const date = last.slice(0, 10);
  const [year, month, day] = date.split('-') as [string, string, string];
  const same = whole(year, month, day, hour!, minute!, second);
  if (same === null || same.slice(0, 16) >= last.slice(0, 16)) return same;
  const next = new Date(Date.UTC(Number(year), Number(month) - 1, Number(day) + 1));
  return `${next.toISOString().slice(0, 10)}${same.slice(10)}`;
}

/** `+0100` and `+01:00` are the same. */
const offsetOf = (offset = ''): string =>
  offset.toUpperCase().replace(/^([+-]\d\d)(\d\d)$/, '$1:$2');

/** 24:00 is the beginning of the next day, as timetables write it. */
function whole(
  year: string,
  month: string,
  day: string,
  hour: string,
  minute: string,
  second = '00',
  offset = '',
): string | null {
  const h = Number(hour);
  const m = Number(minute);
  const s = Number(second);
  const midnight = h === 24 && m === 0 && s === 0;
  if ((h > 23 && !midnight) || m > 59 || s > 59) return null;
  const at = new Date(Date.UTC(Number(year), Number(month) - 1, Number(day)));
  if (at.getUTCMonth() !== Number(month) - 1) return null;
  if (midnight) at.setUTCDate(at.getUTCDate() + 1);
  const date = at.toISOString().slice(0, 10);
  return `${date}T${two(midnight ? 0 : h)}:${two(m)}${s > 0 ? `:${two(s)}` : ''}${offset}`;
}

export const show = (time: string): string => time.replace('T', ' ');

/** Local blocks that lie over each other; times with offsets are left to the server. */
function overlaps(blocks: readonly TypedBlock[]): LineFault[] {
  const local = blocks.filter(({ from, to }) => !hasOffset(from) && !hasOffset(to));
  const ordered = [...local].sort((a, b) => a.from.localeCompare(b.from));
  return ordered.slice(1).flatMap((block, i) => {
    const before = ordered[i]!;
    if (block.from >= before.to) return [];
    const words = `it begins at ${show(block.from)}, before the row of line ${before.line} ends`;
    return [{ line: block.line, words }];
  });
}

/** Hours between two local times, or two with offsets; null where that cannot be said here. */
export function hoursOf({ from, to }: Pick<TypedBlock, 'from' | 'to'>): number | null {
  const known = [from, to].filter(hasOffset).length;
  if (known === 1) return null;
  const ms = (time: string) => Date.parse(known === 2 ? time : `${time}Z`);
  return (ms(to) - ms(from)) / 3_600_000;
}

/** Rows as they can be typed again. */
export function asText(
  blocks: readonly { mode: Mode; power_MW_el: number; from: string; to: string }[],
): string {
  const rows = blocks.map(
    ({ from, to, mode, power_MW_el }) =>
      `${from},${to},${mode},${Math.round(power_MW_el * 1e6) / 1e6}`,
  );
  return ['from,to,mode,power_MW_el', ...rows].join('\n');
}
