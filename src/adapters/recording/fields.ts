import type { ChannelRole } from '../../core/definitions.js';
import { modeOfWord, openingOfWord } from '../../core/scan/words.js';

const NUMBER = /^[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?$/;

/** What stands in a field: a number, nothing, the word NaN, or text that is no reading. */
export interface Field {
  readonly kind: 'value' | 'empty' | 'nan' | 'text';
  /** NaN unless it is a value. */
  readonly value: number;
}

const EMPTY: Field = { kind: 'empty', value: Number.NaN };
const NOT_A_NUMBER: Field = { kind: 'nan', value: Number.NaN };
const TEXT: Field = { kind: 'text', value: Number.NaN };

/** Reads a field of a channel's column; a mode and a valve may be given in words. */
export function parseField(text: string, role: ChannelRole): Field {
  const field = text.trim();
  if (field === '') return EMPTY;
  if (NUMBER.test(field)) {
    const value = Number(field);
    return Number.isFinite(value) ? { kind: 'value', value } : TEXT;
  }
  if (field.toLowerCase() === 'nan') return NOT_A_NUMBER;
  const word =
    role.kind === 'mode'
      ? modeOfWord(field)
      : role.kind === 'valve'
        ? openingOfWord(field)
        : Number.NaN;
  return Number.isNaN(word) ? TEXT : { kind: 'value', value: word };
}
