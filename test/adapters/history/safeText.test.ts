import { gzipSync } from 'node:zlib';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { fromSafeText, toSafeText } from '../../../src/adapters/history/safeText.js';
import { unpackBackup } from '../../../src/adapters/history/unitBackup.js';

const leaf = fc.oneof(
  fc.double(),
  fc.constantFrom(-0, Number.NaN, Number.POSITIVE_INFINITY, undefined, null, true),
  fc.string(),
  fc.float64Array({ maxLength: 20 }),
  fc.uint8Array({ maxLength: 20 }),
  fc.int32Array({ maxLength: 5 }),
);
const name = fc.string().filter((key) => key !== '__proto__' && key !== '$');
const { value } = fc.letrec((tie) => ({
  value: fc.oneof(
    { depthSize: 'small' },
    leaf,
    fc.array(tie('value'), { maxLength: 4 }),
    fc.dictionary(name, tie('value'), { maxKeys: 4, noNullPrototype: true }),
    fc.array(fc.tuple(name, tie('value')), { maxLength: 3 }).map((pairs) => new Map(pairs)),
    fc.array(fc.string(), { maxLength: 3 }).map((values) => new Set(values)),
  ),
}));

describe('a state as safe text', () => {
  it('comes back to the bit', () => {
    fc.assert(
      fc.property(value, (one) => {
        expect(fromSafeText(toSafeText(one))).toStrictEqual(one);
      }),
      { numRuns: 300, seed: 3 },
    );
  });

  it('takes nothing that is not data, and makes nothing else', () => {
    expect(() => toSafeText({ run: () => 1 })).toThrow(/got a function/);
    expect(() => toSafeText(new Date())).toThrow(/got a Date/);
    expect(() => toSafeText({ $: 1 })).toThrow(/plain/);
    for (const text of [
      '{"__proto__": {"x": 1}}',
      '{"$": "constructor"}',
      '{"$": "Float64Array", "base64": "AAA="}',
      '{"$": "number", "text": "12"}',
      `${'['.repeat(100)}${']'.repeat(100)}`,
      '{',
    ]) {
      expect(() => fromSafeText(text), text).toThrow();
    }
    expect(({} as { x?: number }).x).toBeUndefined();
  });

  it('of a newer version or another file is refused in words', () => {
    const file = (head: object) => gzipSync(`${JSON.stringify(head)}\n{}\n`);
    const format = 'rockhour unit backup';
    expect(() => unpackBackup(file({ format, format_version: 2, sha256: '' }))).toThrow(
      /newer rockhour: format 2, this one reads 1/,
    );
    expect(() => unpackBackup(file({ format: 'x' }))).toThrow(/no backup of a unit/);
    expect(() => unpackBackup(gzipSync(Buffer.alloc(200 * 1024 * 1024)))).toThrow(
      /cut off or damaged/,
    );
  });
});
