import { faults, type Routes, unitOf } from '../routes.js';
import { unitParams } from '../schema/questions.js';
import { rewindsQuery, rewindsSchema } from '../schema/rewinds.js';
import { spanOf } from './history.js';

const MONTH_MS = 30 * 86_400_000;
const MOST = 200;

/** GET /api/units/{unit}/rewinds */
export const rewindRoutes: Routes = (app, { service }) => {
  app.get(
    '/api/units/:unit/rewinds',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'rewinds',
        summary: 'Scans that were made again with readings that came late, and what that changed',
        description:
          'Those that reach into the span, newest first, at most ' +
          `${MOST}. Without from and to: the 30 days before the newest estimate.`,
        tags: ['history'],
        params: unitParams,
        querystring: rewindsQuery,
        response: { 200: rewindsSchema.describe('Newest first'), ...faults },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      const unit = now.unit.id;
      const { from, to } = spanOf(request.query, now.estimate?.time, MONTH_MS);
      const found = service.rewinds(unit, from, to, MOST + 1);
      const at = (time_ms: number) => new Date(time_ms).toISOString();
      const rewinds = found.slice(0, MOST).map((one) => ({
        ...one,
        differences: [...one.differences],
      }));
      return { unit, from: at(from), to: at(to), older_left_out: found.length > MOST, rewinds };
    },
  );
};
