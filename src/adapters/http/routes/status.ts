import { z } from 'zod';
import { covers } from '../../../access/role.js';
import { metricsText } from '../metrics.js';
import { faults, type RouteContext, type Routes } from '../routes.js';
import { countersSchema, healthSchema } from '../schema/answers.js';
import { readySchema } from '../schema/backup.js';

/** What this adapter counts itself, beside the counters of the daemon. */
function ownCounters(context: RouteContext): Record<string, number> {
  const { json, stream } = context;
  return {
    http_non_finite_numbers: json.nonFinite,
    http_slow_streams_ended: stream.slowEnded,
    http_connections_refused: context.connectionsRefused(),
    http_unread_ended: context.unreadEnded(),
  };
}

/** GET /api/ready, /api/health, /api/counters, /metrics, /api/openapi.json */
export const statusRoutes: Routes = (app, context) => {
  const { service, entrance } = context;
  const tags = ['status'];
  // A probe must not be turned away because a page asks much.
  const config = { role: 'view', rateLimit: false } as const;

  app.get(
    '/api/health',
    {
      config,
      schema: {
        operationId: 'health',
        summary: 'Whether every part of the daemon is well',
        description: '200 if so, else 503; the body is the same.',
        tags,
        response: {
          200: healthSchema.describe('Every part is well'),
          503: healthSchema.describe('At least one part is not well'),
        },
      },
    },
    async (_request, reply) => {
      const parts = service.health();
      const ok = parts.every((part) => part.ok);
      reply.code(ok ? 200 : 503);
      return { ok, site: service.siteName, version: service.version, parts: [...parts] };
    },
  );

  app.get(
    '/api/ready',
    {
      config: { role: 'public', rateLimit: false },
      schema: {
        operationId: 'ready',
        summary: 'Whether it can do its work: units started, journal written, readings worked off',
        description: '200 if so, else 503. Why not is told to whoever may look.',
        tags,
        response: {
          200: readySchema.describe('It can'),
          503: readySchema.describe('It cannot, yet or now'),
        },
      },
    },
    async ({ holder }, reply) => {
      const reasons = service.unready();
      const ready = reasons.length === 0;
      reply.code(ready ? 200 : 503);
      const mayLook = holder === null ? entrance.access.isOpen : covers(holder.role, 'view');
      return { ready, ...(mayLook && !ready ? { reasons } : {}) };
    },
  );

  app.get(
    '/api/counters',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'counters',
        summary: 'Counts of the daemon',
        tags,
        response: { 200: countersSchema.describe('Counts since the start, by name'), ...faults },
      },
    },
    async () => ({ counters: { ...service.counters(), ...ownCounters(context) } }),
  );

  app.get(
    '/metrics',
    {
      config,
      schema: {
        operationId: 'metrics',
        summary: 'The same for Prometheus',
        tags,
        response: {
          200: {
            description: 'Text exposition format',
            content: { 'text/plain': { schema: z.string() } },
          },
        },
      },
    },
    async (_request, reply) => {
      const { text, contentType } = await metricsText(
        service,
        ownCounters(context),
        context.faultCounts,
      );
      reply.type(contentType);
      return text;
    },
  );

  const described = { schema: { hide: true }, config: { role: 'view' } } as const;
  app.get('/api/openapi.json', described, async (_request, reply) => {
    reply.type('application/json; charset=utf-8');
    return JSON.stringify(app.swagger());
  });
};
