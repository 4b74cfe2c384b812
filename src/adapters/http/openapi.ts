import { jsonSchemaTransform } from 'fastify-type-provider-zod';

type Transform = typeof jsonSchemaTransform;
type Document = Parameters<Transform>[0];
type Bodies = { content: Record<string, { schema: unknown }> };

const isBodies = (body: unknown): body is Bodies =>
  typeof body === 'object' && body !== null && 'content' in body;

/** As the type provider's, which takes one kind of body alone: a route may take several. */
export const transformSchemas: Transform = (document: Document) => {
  const { body, ...schema } = document.schema ?? {};
  if (!isBodies(body)) return jsonSchemaTransform(document);
  const transformed = jsonSchemaTransform({ ...document, schema } as Document);
  const content = Object.entries(body.content).map(([type, kind]) => {
    const only = { ...document, schema: { body: kind.schema } } as Document;
    const own = jsonSchemaTransform(only).schema as { body: unknown };
    return [type, { schema: own.body }] as const;
  });
  return {
    ...transformed,
    schema: { ...transformed.schema, body: { content: Object.fromEntries(content) } },
  };
};
