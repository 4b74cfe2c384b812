import type { BalanceAsk } from '../../../core/plan/balance.js';
import { HttpFault, wrongValue } from '../faults.js';
import { askPlan } from '../planHead.js';
import { faults, type Routes, unitOf } from '../routes.js';
import { balanceQuery, balanceSchema } from '../schema/balance.js';
import { unitParams } from '../schema/questions.js';

/** GET /api/units/{unit}/balance */
export const balanceRoutes: Routes = (app, { service, tuning }) => {
  app.get(
    '/api/units/:unit/balance',
    {
      config: { role: 'view', rateLimit: { max: tuning.hours_per_min, timeWindow: 60_000 } },
      schema: {
        operationId: 'balance',
        summary: 'What flushing the fronts would win back, and how the two stores match',
        tags: ['ahead'],
        params: unitParams,
        querystring: balanceQuery,
        response: { 200: balanceSchema.describe('Flush and mismatch'), ...faults },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      const { power_MW, charge_MWh_el, stale, ...prices } = request.query;
      const { charge, discharge } = now.unit.limits;
      const [least, most] = [discharge.power_min_W / 1e6, discharge.power_max_W / 1e6];
      if (power_MW !== undefined && !(power_MW >= least && power_MW <= most)) {
        throw wrongValue('power_MW', power_MW, `${least} to ${most} MW, as the unit discharges`);
      }
      const through_W = now.unit.limits.connection?.import_max_W ?? charge.power_max_W;
      if (!(through_W > 0 && through_W >= charge.power_min_W)) {
        const words = `unit ${now.unit.id} cannot charge: its connection takes in ${through_W / 1e6} MW_el at most`;
        throw new HttpFault(503, 'question_failed', words);
      }
      const { price_per_MWh_el, charging_price_per_MWh_el } = prices;
      const ask: BalanceAsk = {
        ...(power_MW === undefined ? {} : { power_W: power_MW * 1e6 }),
        ...(charge_MWh_el === undefined ? {} : { charge_J: charge_MWh_el * 3.6e9 }),
        ...(price_per_MWh_el === undefined
          ? {}
          : {
              prices: {
                price_per_MWh_el,
                ...(charging_price_per_MWh_el === undefined ? {} : { charging_price_per_MWh_el }),
              },
            }),
      };
      const { head, answer } = await askPlan(service, now, stale, { kind: 'balance', ask });
      return { ...head, ...answer };
    },
  );
};
