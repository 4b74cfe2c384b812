import { z } from 'zod';
import { siteSchema } from './schema/site.js';

/**
 * JSON Schema (draft 2020-12) of a site file, from the same source that rockhour reads it with:
 * descriptions, defaults, examples; `x-unit` and `x-otherwise` carry unit and computed default.
 */
export function siteJsonSchema(): Record<string, unknown> {
  const schema = z.toJSONSchema(siteSchema, {
    io: 'input',
    override: ({ jsonSchema }) => {
      const node = jsonSchema as Record<string, unknown>;
      rename(node, 'unit', 'x-unit');
      rename(node, 'otherwise', 'x-otherwise');
      rename(node, 'form', 'x-form');
    },
  });
  return { title: 'rockhour site', ...(schema as Record<string, unknown>) };
}

/** Only annotations are text; a property that is called `unit` sits below `properties`. */
function rename(node: Record<string, unknown>, from: string, to: string): void {
  if (typeof node[from] !== 'string') return;
  node[to] = node[from];
  delete node[from];
}
