import { z } from 'zod';

/** As much of OpenAPI 3.1 as is needed to hold a document against the answers that it describes. */
export interface Operation {
  readonly operationId?: string;
  readonly summary?: string;
  readonly parameters?: readonly {
    readonly name: string;
    readonly in: string;
    readonly required?: boolean;
    readonly schema: object;
  }[];
  readonly requestBody?: { readonly content: Readonly<Record<string, { schema: object }>> };
  readonly responses: Readonly<
    Record<
      string,
      {
        readonly description?: string;
        readonly content?: Readonly<Record<string, { readonly schema: object }>>;
      }
    >
  >;
}

export interface OpenApiDocument {
  readonly openapi: string;
  readonly info: { readonly title?: string; readonly version?: string };
  readonly servers?: readonly { readonly url: string }[];
  readonly paths: Readonly<Record<string, Readonly<Record<string, Operation>>>>;
}

/** Path, method and operation of everything in the document. */
export function operations(document: OpenApiDocument): [string, string, Operation][] {
  return Object.entries(document.paths).flatMap(([path, methods]) =>
    Object.entries(methods).map(([method, operation]): [string, string, Operation] => [
      path,
      method,
      operation,
    ]),
  );
}

/** What is against the OpenAPI Specification 3.1.0, or useless for a reader; empty where nothing. */
export function faultsOf(document: OpenApiDocument): string[] {
  const faults: string[] = [];
  const check = (holds: unknown, what: string) => {
    if (!holds) faults.push(what);
  };
  check(/^3\.1\.\d+$/.test(document.openapi), `openapi is ${document.openapi}`);
  check(document.info.title && document.info.version, 'info lacks title or version');
  check(!JSON.stringify(document).includes('"$ref"'), 'a $ref, which this check does not follow');
  const ids = new Set<string>();
  for (const [path, method, operation] of operations(document)) {
    const name = `${method} ${path}`;
    check(path.startsWith('/'), `${name}: a path begins with /`);
    check(/^(get|put|post|delete|patch|head|options|trace)$/.test(method), `${name}: no method`);
    const { operationId, summary, parameters = [], responses } = operation;
    check(operationId && !ids.has(operationId), `${name}: operationId missing or not unique`);
    ids.add(operationId ?? '');
    check(summary, `${name}: no summary`);
    const templated = [...path.matchAll(/\{([^}]+)\}/g)].map(([, word]) => word).sort();
    const inPath = parameters.filter((one) => one.in === 'path');
    check(
      JSON.stringify(inPath.map((one) => one.name).sort()) === JSON.stringify(templated),
      `${name}: path parameters ${inPath.map((one) => one.name)}`,
    );
    for (const one of inPath) check(one.required === true, `${name}: ${one.name} not required`);
    const keys = parameters.map((one) => `${one.in} ${one.name}`);
    check(new Set(keys).size === keys.length, `${name}: a parameter twice`);
    check(Object.keys(responses).length > 0, `${name}: no response`);
    for (const [status, { description, content = {} }] of Object.entries(responses)) {
      check(/^([1-5]\d\d|[1-5]XX|default)$/.test(status), `${name}: status ${status}`);
      check(description && description !== 'Default Response', `${name} ${status}: no description`);
      check(Object.keys(content).length > 0, `${name} ${status}: no content`);
    }
  }
  return faults;
}

/**
 * The schema of an answer by status and media type. Objects refuse keys that the document does not
 * name, as it says itself (additionalProperties false).
 */
export function answerSchema(operation: Operation, status: number, type: string): z.ZodType {
  const { responses } = operation;
  const found = responses[status] ?? responses[`${Math.floor(status / 100)}XX`];
  const schema = found?.content?.[type]?.schema;
  if (!schema) throw new RangeError(`no schema for ${status} ${type}`);
  return z.fromJSONSchema(schema as Parameters<typeof z.fromJSONSchema>[0]);
}
