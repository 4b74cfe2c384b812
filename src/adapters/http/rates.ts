import rateLimit from '@fastify/rate-limit';
import type { FastifyReply, FastifyRequest } from 'fastify';
import { networkOf } from '../../access/places.js';
import { HttpFault } from './faults.js';
import type { HttpApp } from './routes.js';

/** Bounds the questions a minute of each token, and of each address that shows none. */
export async function addRates(app: HttpApp, questions_per_min: number): Promise<void> {
  await app.register(rateLimit, {
    keyGenerator: ({ holder, ip }) => (holder === null ? networkOf(ip) : `token ${holder.name}`),
    max: questions_per_min,
    timeWindow: 60_000,
    errorResponseBuilder: (_request, { max, ttl }) => tooMany(max, ttl),
  });
}

/**
 * Counts a question that is refused before its route is reached, where the bound would not see it.
 * @throws HttpFault 429 beyond the bound
 */
export async function countRefused(request: FastifyRequest, reply: FastifyReply): Promise<void> {
  const counted = await request.server.createRateLimit()(request);
  if (counted.isAllowed || !counted.isExceeded) return;
  reply.header('retry-after', String(counted.ttlInSeconds));
  throw tooMany(counted.max, counted.ttl);
}

function tooMany(max: number, ttl_ms: number): HttpFault {
  const words = `more than ${max} questions within a minute; ask again in ${Math.ceil(ttl_ms / 1000)} s`;
  return new HttpFault(429, 'too_many_requests', words, { expected: `at most ${max} a minute` });
}
