/**
 * Writes what is made from the schema of site files: config/REFERENCE.md and
 * config/site.schema.json. Run `npx tsx tools/configReference.ts` after a change of src/config/schema;
 * a test holds the files against the schema.
 */
import { writeFileSync } from 'node:fs';
import { siteJsonSchema } from '../src/config/jsonSchema.js';
import { referenceText } from '../src/config/reference.js';

const folder = new URL('../config/', import.meta.url);
writeFileSync(new URL('REFERENCE.md', folder), referenceText());
writeFileSync(
  new URL('site.schema.json', folder),
  `${JSON.stringify(siteJsonSchema(), null, 2)}\n`,
);
