import { z } from 'zod';
import { bare, isRequired, noteOf } from './schemaWalk.js';

/** What a key expects, in words: `a number above 0, at most 500 [mm], such as 20`. */
export function expectedWords(schema: z.ZodType): string {
  const note = noteOf(schema);
  const kind = kindWords(bare(schema));
  const unit = note.unit === undefined || note.unit === '-' ? '' : ` [${note.unit}]`;
  const example = note.examples?.[0];
  const such =
    example === undefined || kind.startsWith('the word') || kind.startsWith('one of')
      ? ''
      : `, such as ${typeof example === 'string' ? example : JSON.stringify(example)}`;
  return `${kind}${unit}${such}`;
}

interface JsonNode {
  readonly type?: string;
  readonly minimum?: number;
  readonly exclusiveMinimum?: number;
  readonly maximum?: number;
  readonly minItems?: number;
  readonly maxItems?: number;
}

function kindWords(schema: z.ZodType): string {
  if (schema instanceof z.ZodLiteral) return `the word ${[...schema.values].join(' or ')}`;
  if (schema instanceof z.ZodEnum) return `one of ${schema.options.join(', ')}`;
  if (schema instanceof z.ZodDiscriminatedUnion)
    return `a block whose ${discriminatorWords(schema)}`;
  if (schema instanceof z.ZodUnion) {
    return (schema.options as readonly z.ZodType[])
      .map((o) => kindWords(bare(o)))
      .join(', or ')
      .replace(/the word (\S+), or the word (\S+)/, 'one of $1, $2');
  }
  if (schema instanceof z.ZodObject) {
    const required = Object.keys(schema.shape).filter((k) =>
      isRequired(schema.shape[k] as z.ZodType),
    );
    return required.length === 0
      ? `a block with any of the keys ${Object.keys(schema.shape).join(', ')}`
      : `a block with the keys ${required.join(', ')}`;
  }
  if (schema instanceof z.ZodString || schema instanceof z.ZodStringFormat) {
    return noteOf(schema).form ?? 'a text';
  }
  const json = z.toJSONSchema(schema, { io: 'input', unrepresentable: 'any' }) as JsonNode;
  if (schema instanceof z.ZodArray) {
    const count = countWords(json.minItems, json.maxItems);
    return `a list${count}, each ${kindWords(bare(schema.element as z.ZodType))}`;
  }
  const whole = json.type === 'integer' ? 'a whole number' : 'a number';
  const range = rangeWords(json.minimum, json.exclusiveMinimum, json.maximum);
  return range === '' ? whole : `${whole} ${range}`;
}

function discriminatorWords(schema: z.ZodDiscriminatedUnion): string {
  const key = schema.def.discriminator;
  const words = (schema.options as readonly z.ZodObject[]).flatMap((option) => {
    const literal = option.shape[key];
    return literal instanceof z.ZodLiteral ? [...literal.values].map(String) : [];
  });
  return `\`${key}\` is one of ${words.join(', ')}`;
}

function rangeWords(
  min: number | undefined,
  above: number | undefined,
  max: number | undefined,
): string {
  const parts: string[] = [];
  if (above !== undefined) parts.push(`above ${above}`);
  if (min !== undefined && min > Number.MIN_SAFE_INTEGER) parts.push(`from ${min}`);
  if (max !== undefined && max < Number.MAX_SAFE_INTEGER) parts.push(`up to ${max}`);
  return parts.join(' ');
}

function countWords(min: number | undefined, max: number | undefined): string {
  if (max === undefined) return '';
  if (min === undefined) return ` of at most ${max} entries`;
  return min === max ? ` of ${min} entries` : ` of ${min} to ${max} entries`;
}
