import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { siteJsonSchema } from '../../src/config/jsonSchema.js';
import { referenceEntries, referenceText } from '../../src/config/reference.js';
import { CONFIG_FOLDER, EXAMPLES, exampleData } from './sites.js';

const entries = referenceEntries();

describe('the reference of keys', () => {
  it('has a description of every key', () => {
    expect(entries.filter((e) => e.description === '').map((e) => e.path)).toEqual([]);
  });

  it('has unit, default and example of every key that is no section', () => {
    const keys = entries.filter((e) => !e.isSection);
    expect(keys.length).toBeGreaterThan(150);
    const lacking = keys.filter((e) => e.unit === '' || e.default === '' || e.example === '');
    expect(lacking.map((e) => e.path)).toEqual([]);
  });

  it('says of every key that may be left out what then holds', () => {
    const silent = entries.filter(
      (e) => e.default === 'none' && !/^influx$|_type|_junction|user|pass/.test(e.path),
    );
    expect(silent.map((e) => e.path)).toEqual([]);
  });

  it('knows every key that the examples use', () => {
    const known = new Set(entries.map((e) => e.path.replace(/\([^)]*\)/g, '')));
    const used: string[] = [];
    const walk = (value: unknown, path: string): void => {
      if (Array.isArray(value)) for (const part of value) walk(part, `${path}[]`);
      else if (value !== null && typeof value === 'object') {
        for (const [key, part] of Object.entries(value)) {
          const here = path === '' ? key : `${path}.${key}`;
          used.push(here);
          walk(part, here);
        }
      }
    };
    for (const name of EXAMPLES) walk(exampleData(name), '');
    expect([...new Set(used)].filter((path) => !known.has(path))).toEqual([]);
  });

  it('in config/REFERENCE.md is what the schema says; `npx tsx tools/configReference.ts` writes it', () => {
    expect(readFileSync(`${CONFIG_FOLDER}REFERENCE.md`, 'utf8')).toBe(referenceText());
  });

  it('for editors in config/site.schema.json is what the schema says', () => {
    const file = JSON.parse(readFileSync(`${CONFIG_FOLDER}site.schema.json`, 'utf8')) as unknown;
    expect(file).toEqual(JSON.parse(JSON.stringify(siteJsonSchema())));
  });

  it('gives examples that the schema itself accepts', () => {
    // Each example is put where its key stands in the JSON Schema and read there.
    const wrong: string[] = [];
    const walk = (node: unknown, path: string): void => {
      if (node === null || typeof node !== 'object') return;
      const {
        examples,
        type,
        enum: words,
        minimum,
        maximum,
      } = node as {
        examples?: unknown[];
        type?: string;
        enum?: unknown[];
        minimum?: number;
        maximum?: number;
      };
      for (const example of examples ?? []) {
        if (words !== undefined && !words.includes(example)) wrong.push(path);
        if ((type === 'number' || type === 'integer') && typeof example !== 'number')
          wrong.push(path);
        if (type === 'string' && typeof example !== 'string') wrong.push(path);
        if (type === 'array' && !Array.isArray(example)) wrong.push(path);
        if (
          typeof example === 'number' &&
          (example < (minimum ?? example) || example > (maximum ?? example))
        ) {
          wrong.push(path);
        }
      }
      for (const [key, part] of Object.entries(node)) walk(part, `${path}/${key}`);
    };
    walk(siteJsonSchema(), '');
    expect(wrong).toEqual([]);
  });
});
