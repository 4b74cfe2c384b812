import type { FastifyError, FastifyReply, FastifyRequest } from 'fastify';
import { hasZodFastifySchemaValidationErrors } from 'fastify-type-provider-zod';
import { withoutTokens } from './auth.js';
import { type FaultBody, type FaultCounts, HttpFault, show } from './faults.js';
import { keysOf } from './schema/questions.js';

type Part = 'querystring' | 'params' | 'body' | 'headers';
type Issue = { instancePath: string; message?: string; keyword: string; params: object };
type Detail = { field: string | null; value: unknown; expected: string | null };

function sent(request: FastifyRequest, part: Part): unknown {
  return { querystring: request.query, params: request.params, body: request.body, headers: {} }[
    part
  ];
}

function valueAt(source: unknown, path: readonly string[]): unknown {
  return path.reduce<unknown>(
    (at, key) =>
      typeof at === 'object' && at !== null ? (at as Record<string, unknown>)[key] : null,
    source,
  );
}

function detailsOf(issue: Issue, request: FastifyRequest, part: Part): Detail[] {
  const source = sent(request, part);
  const path = issue.instancePath.split('/').filter(Boolean);
  if (issue.keyword === 'unrecognized_keys') {
    const known = keysOf(request.routeOptions.schema?.[part], path);
    const expected = known.length > 0 ? `only ${known.join(', ')}` : 'nothing here';
    const { keys = [] } = issue.params as { keys?: string[] };
    return keys.map((key) => ({
      field: [...path, key].join('.'),
      value: valueAt(source, [...path, key]) ?? null,
      expected,
    }));
  }
  const value = valueAt(source, path) ?? null;
  return [{ field: path.join('.') || part, value, expected: issue.message ?? null }];
}

/** A question that its schema refuses: the first fault in words, the others listed. */
function fromValidation(error: FastifyError, request: FastifyRequest): HttpFault {
  const part = (error.validationContext ?? 'querystring') as Part;
  const issues = error.validation as unknown as Issue[];
  const [first, ...others] = issues.flatMap((issue) => detailsOf(issue, request, part));
  const { field, value, expected } = first ?? { field: part, value: null, expected: null };
  const unknown = issues[0]?.keyword === 'unrecognized_keys';
  const missing = !unknown && value === null;
  const found = missing ? 'is missing' : unknown ? 'is not known here' : `is ${show(value)}`;
  const message = `${field} ${found}; expected ${expected}`;
  return new HttpFault(400, unknown ? 'unknown_field' : 'wrong_value', message, {
    ...(field === null ? {} : { field }),
    value,
    ...(expected === null ? {} : { expected }),
    others,
  });
}

/** The types of a body that a route takes. */
function takenTypes(request: FastifyRequest): string[] {
  const body = request.routeOptions.schema?.body as { content?: object } | undefined;
  return body?.content === undefined ? ['application/json'] : Object.keys(body.content);
}

/** Any error of a request as the answer that the client gets. */
export function answerOf(error: FastifyError | Error, request: FastifyRequest): HttpFault {
  if (error instanceof HttpFault) return error;
  if (hasZodFastifySchemaValidationErrors(error)) {
    return fromValidation(error as unknown as FastifyError, request);
  }
  const status = (error as FastifyError).statusCode ?? 500;
  if (status === 415) {
    const expected = `content-type ${takenTypes(request).join(' or ')}`;
    return new HttpFault(415, 'unreadable_body', `${error.message}; expected ${expected}`, {
      field: 'content-type',
      value: request.headers['content-type'] ?? null,
      expected,
    });
  }
  if ((error as FastifyError).code === 'FST_ERR_BAD_URL') {
    return new HttpFault(400, 'unknown_route', 'the address cannot be decoded', {
      ...{ field: 'path', value: request.url, expected: 'UTF-8, percent-encoded' },
    });
  }
  if (status >= 400 && status < 500) {
    return new HttpFault(status, 'unreadable_body', error.message, {
      expected: 'a JSON body with content-type application/json',
    });
  }
  return new HttpFault(
    500,
    'internal',
    `an error of the daemon itself, written to its log under request ${request.id}`,
  );
}

/** A refusal of stale estimates is told at most this often [ms]: programs ask again and again. */
const TELL_STALE_EVERY_MS = 60_000;

/**
 * fastify's error handler. Faults of the client are not logged; ours are. A stale estimate is the
 * plant's doing: a warning without a stack.
 */
export function errorHandler(counts: FaultCounts) {
  let told_ms = Number.NEGATIVE_INFINITY;
  return function sendError(error: Error, request: FastifyRequest, reply: FastifyReply): FaultBody {
    const fault = answerOf(error, request);
    counts.add(fault.code);
    if (fault.code === 'estimate_stale') {
      if (performance.now() - told_ms >= TELL_STALE_EVERY_MS) {
        told_ms = performance.now();
        request.log.warn({ url: request.url }, fault.message);
      }
    } else if (fault.statusCode >= 500 && fault.code !== 'no_estimate_yet') {
      request.log.error({ err: fault.cause ?? error, url: request.url }, fault.message);
    }
    reply.code(fault.statusCode).type('application/json; charset=utf-8');
    return withoutTokens(fault.body());
  };
}
