import { z } from 'zod';
import { faults, type Routes, unitOf } from '../routes.js';
import { reportQuery, unitParams } from '../schema/questions.js';
import { spanOf } from './history.js';

const MONTH_MS = 30 * 86_400_000;
const TYPES = {
  html: 'text/html; charset=utf-8',
  json: 'application/json; charset=utf-8',
  csv: 'text/csv; charset=utf-8; header=present',
} as const;

/** GET /api/units/{unit}/report */
export const reportRoutes: Routes = (app, { service, tuning }) => {
  app.get(
    '/api/units/:unit/report',
    {
      config: { role: 'view', rateLimit: { max: tuning.hours_per_min, timeWindow: 60_000 } },
      schema: {
        operationId: 'report',
        summary: 'What happened to the beds in a span of time, for maintenance',
        description:
          'Findings first. One file of HTML that asks for nothing else, JSON with all of it, or one ' +
          'table as CSV. Without from and to: the 30 days before the newest estimate.',
        tags: ['watch'],
        params: unitParams,
        querystring: reportQuery,
        response: {
          200: {
            description: 'By `format`',
            content: {
              'text/html': { schema: z.string() },
              'application/json': { schema: z.string() },
              'text/csv': { schema: z.string() },
            },
          },
          ...faults,
        },
      },
    },
    async (request, reply) => {
      const now = unitOf(service, request.params.unit);
      const { format = 'html', table } = request.query;
      const { from, to } = spanOf(request.query, now.estimate?.time, MONTH_MS);
      const { text, style } = await service.bedReport(now.unit.id, {
        ...{ from_ms: from, to_ms: to, format },
        table: table ?? 'runs',
      });
      // Its one sheet of style and nothing else; no script runs in it, wherever it came from.
      reply.header(
        'content-security-policy',
        `default-src 'none'; style-src '${style}'; base-uri 'none'; form-action 'none'; frame-ancestors 'none'; sandbox allow-popups`,
      );
      if (format !== 'html') {
        const name = now.unit.id.replace(/[^\w.-]+/g, '_');
        reply.header(
          'content-disposition',
          `attachment; filename="${name}-report-${table ?? ''}.${format}"`.replace('-.', '.'),
        );
      }
      reply.type(TYPES[format]);
      return reply.serializer((body: unknown) => String(body)).send(text);
    },
  );
};
