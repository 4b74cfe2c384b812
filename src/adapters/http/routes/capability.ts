import { z } from 'zod';
import type { Capability } from '../../../core/plan/capability.js';
import { STAND_COLUMNS, type Stand, standOf, toCsv, wantsCsv } from '../csv.js';
import { askPlan } from '../planHead.js';
import { faults, type Routes, unitOf } from '../routes.js';
import { capabilityQuery, capabilitySchema } from '../schema/capability.js';
import { unitParams } from '../schema/questions.js';

/** Both curves as rows, each with the direction that it is of. */
function csvOf(head: Stand, answer: Capability): string {
  const curves = [answer.discharge, answer.charge];
  const stores = [
    ...new Set(
      curves.flatMap(({ points }) =>
        points.flatMap(({ stored_MWh_th }) => Object.keys(stored_MWh_th)),
      ),
    ),
  ];
  const stored = (id: string) => `${id}_stored_MWh_th`;
  const columns = [
    ...STAND_COLUMNS,
    'direction',
    'state_of_charge',
    'power_MW_el',
    'limited_by',
    'energy_MWh_el',
    ...stores.map(stored),
    'largest_error_MW_el',
  ];
  const rows = curves.flatMap(({ direction, largest_error_MW_el, points }) =>
    points.map(({ stored_MWh_th, ...point }) => ({
      ...standOf(head),
      time: head.time,
      direction,
      ...point,
      ...Object.fromEntries(stores.map((id) => [stored(id), stored_MWh_th[id] ?? null])),
      largest_error_MW_el,
    })),
  );
  return toCsv(columns, rows);
}

/** GET /api/units/{unit}/capability as JSON or CSV. */
export const capabilityRoutes: Routes = (app, { service, tuning }) => {
  app.get(
    '/api/units/:unit/capability',
    {
      config: { role: 'view', rateLimit: { max: tuning.hours_per_min, timeWindow: 60_000 } },
      schema: {
        operationId: 'capability',
        summary: 'Greatest power in both directions against state of charge, as straight lines',
        tags: ['ahead'],
        params: unitParams,
        querystring: capabilityQuery,
        response: {
          200: {
            description: 'JSON, or CSV after RFC 4180',
            content: {
              'application/json': { schema: capabilitySchema },
              'text/csv': { schema: z.string() },
            },
          },
          ...faults,
        },
      },
    },
    async (request, reply) => {
      const now = unitOf(service, request.params.unit);
      const { tolerance, format, stale } = request.query;
      const ask = {
        kind: 'capability',
        ask: tolerance === undefined ? {} : { tolerance },
      } as const;
      const { head, answer } = await askPlan(service, now, stale, ask);
      reply.header('vary', 'Accept');
      if (wantsCsv(format, request.headers.accept)) {
        const name = now.unit.id.replace(/[^\w.-]+/g, '_');
        reply.header('content-disposition', `attachment; filename="${name}-capability.csv"`);
        reply.type('text/csv; charset=utf-8; header=present');
        return csvOf(head, answer);
      }
      reply.type('application/json; charset=utf-8');
      return { ...head, ...answer };
    },
  );
};
