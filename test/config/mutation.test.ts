import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { z } from 'zod';
import { siteJsonSchema } from '../../src/config/jsonSchema.js';
import { parseSite } from '../../src/config/load.js';
import { siteSchema } from '../../src/config/schema/site.js';
import { runs } from '../support/runs.js';
import { mutate, mutation } from './mutation.js';
import { CONFIG_FOLDER, EXAMPLES, exampleData, exampleText, parseData } from './sites.js';

const SEED = 20240917;

describe('a sound file with random changes', () => {
  it.each(EXAMPLES)('gives a site or faults in words, and never anything else: %s', (name) => {
    const data = exampleData(name);
    fc.assert(
      fc.property(fc.array(mutation, { minLength: 1, maxLength: 4 }), (mutations) => {
        const parsed = parseData(mutations.reduce(mutate, data));
        if (parsed.faults === undefined) {
          expect(Object.isFrozen(parsed.site)).toBe(true);
          return;
        }
        expect(parsed.faults.length).toBeGreaterThan(0);
        for (const fault of parsed.faults) {
          for (const word of [fault.path, fault.found, fault.expected]) {
            expect(word).toMatch(/\S/);
            expect(word).not.toMatch(/undefined|\[object|NaN.*NaN/);
          }
        }
      }),
      { seed: SEED, numRuns: runs(50) },
    );
  });

  it('cut off anywhere gives faults or a site', () => {
    const text = exampleText('demo');
    fc.assert(
      fc.property(fc.integer({ min: 0, max: text.length }), fc.string(), (at, piece) => {
        const parsed = parseSite(text.slice(0, at) + piece, CONFIG_FOLDER, {});
        expect(parsed.site !== undefined || parsed.faults!.length > 0).toBe(true);
      }),
      { seed: SEED, numRuns: runs(75) },
    );
  });
});

describe('the JSON Schema', () => {
  // Read back by zod's own reader of JSON Schema: what an editor would hold the file against.
  const fromJson = z.fromJSONSchema(
    JSON.parse(JSON.stringify(siteJsonSchema())) as Parameters<typeof z.fromJSONSchema>[0],
  );

  it.each(EXAMPLES)('accepts the example %s', (name) => {
    expect(fromJson.safeParse(exampleData(name)).success).toBe(true);
  });

  it.each(EXAMPLES)('agrees with the schema on random changes of %s', (name) => {
    const data = exampleData(name);
    const count = runs(150);
    let refused = 0;
    fc.assert(
      fc.property(mutation, (m) => {
        // As it would stand in a file: without NaN, infinities and undefined.
        const changed: unknown = JSON.parse(JSON.stringify(mutate(data, m)));
        const sound = siteSchema.safeParse(changed).success;
        if (!sound) refused++;
        expect(fromJson.safeParse(changed).success).toBe(sound);
      }),
      { seed: SEED, numRuns: count },
    );
    // Both sides of the comparison were seen.
    expect(refused).toBeGreaterThan(count / 10);
    expect(refused).toBeLessThan(count);
  });
});
