import { askPlan } from '../planHead.js';
import { faults, type Routes, unitOf } from '../routes.js';
import { headroomQuery, headroomSchema } from '../schema/plan.js';
import { unitParams } from '../schema/questions.js';
import { balanceRoutes } from './balance.js';
import { capabilityRoutes } from './capability.js';

/** GET /api/units/{unit}/headroom, and with it capability and balance. */
export const planRoutes: Routes = (app, context) => {
  capabilityRoutes(app, context);
  balanceRoutes(app, context);
  const { service, tuning } = context;
  const tags = ['ahead'];
  const config = {
    role: 'view',
    rateLimit: { max: tuning.hours_per_min, timeWindow: 60_000 },
  } as const;

  app.get(
    '/api/units/:unit/headroom',
    {
      config,
      schema: {
        operationId: 'headroom',
        summary: 'Hours and energy that the unit can still take at given charging powers',
        tags,
        params: unitParams,
        querystring: headroomQuery,
        response: { 200: headroomSchema.describe('An answer per power asked for'), ...faults },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      const { power_MW, stale } = request.query;
      const powers_W = power_MW.map((power) => power * 1e6);
      const ask = { kind: 'headroom', ask: { powers_W } } as const;
      const { head, answer } = await askPlan(service, now, stale, ask);
      return { ...head, answers: answer };
    },
  );
};
