import type { z } from 'zod';
import { limitedAnswers } from '../../../core/plan/limitedBy.js';
import { HttpFault } from '../faults.js';
import { glanceView } from '../glance.js';
import { fullHead, requireEstimate } from '../planHead.js';
import { faults, type Routes, unitOf } from '../routes.js';
import { unitHoursSchema, unitListSchema, unitNowSchema } from '../schema/answers.js';
import { headroomQuery } from '../schema/plan.js';
import { sensorsQuery, unitParams } from '../schema/questions.js';
import { unitWorthSchema } from '../schema/worth.js';
import type { PlantService, UnitNow } from '../service.js';
import { definitionView, noEstimate, stateView, worthView } from '../views.js';

async function askHours(
  service: PlantService,
  now: UnitNow,
  { power_MW: powers, stale }: z.output<typeof headroomQuery>,
) {
  const unit = now.unit.id;
  const estimate = requireEstimate(now, stale);
  try {
    const { time, answers } = await service.hours(unit, powers);
    const head = fullHead(service, now, estimate, time);
    return { ...head, answers: limitedAnswers(now.unit, time, answers) };
  } catch (cause) {
    const why = cause instanceof Error ? cause.message : String(cause);
    const fault = new HttpFault(
      503,
      'question_failed',
      `the hours of unit ${unit} at ${powers.join(', ')} MW could not be computed: ${why}`,
      { field: 'power_MW', value: powers },
    );
    fault.cause = cause;
    throw fault;
  }
}

async function askSensors(service: PlantService, now: UnitNow, over: 'now' | 'day') {
  const unit = now.unit.id;
  const failed = (why: string, cause?: unknown): HttpFault => {
    const fault = new HttpFault(
      503,
      'question_failed',
      `what the thermocouples of unit ${unit} are worth could not be computed: ${why}`,
      { field: 'over', value: over },
    );
    if (cause !== undefined) fault.cause = cause;
    return fault;
  };
  const time = over === 'now' ? (now.estimate?.time ?? null) : null;
  let worth: Awaited<ReturnType<PlantService['sensors']>>;
  try {
    worth = await service.sensors(unit, over);
  } catch (cause) {
    throw failed(cause instanceof Error ? cause.message : String(cause), cause);
  }
  if (worth === null) throw failed('not every store has had readings yet');
  return worthView(worth, time);
}

/** GET /api/units, /api/units/{unit}, .../hours, .../sensors */
export const unitRoutes: Routes = (app, { service, tuning }) => {
  const tags = ['units'];

  app.get(
    '/api/units',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'units',
        summary: 'All units at a glance',
        tags,
        response: { 200: unitListSchema.describe('The units of the site'), ...faults },
      },
    },
    async () => ({
      site: service.siteName,
      version: service.version,
      units: service.unitIds().flatMap((id) => {
        const now = service.now(id);
        if (now === undefined) return [];
        return [glanceView(now, service.standing(id), service.heldBack(id).length)];
      }),
      left_out: (service.leftOut?.() ?? []).map(({ id: unit, name, faults: found }) => ({
        ...{ unit, name, faults: [...found] },
      })),
    }),
  );

  app.get(
    '/api/units/:unit',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'unit',
        summary: 'A unit now: definition, estimate, hours, age of its data',
        tags,
        params: unitParams,
        response: {
          200: unitNowSchema.describe('The unit now; estimate and hours are null before the first'),
          ...faults,
        },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      // Before the first estimate the limits are those of this moment.
      const at_ms = now.estimate === null ? Date.now() : Date.parse(now.estimate.time);
      return { ...stateView(now), definition: definitionView(now.unit, at_ms) };
    },
  );

  app.get(
    '/api/units/:unit/hours',
    {
      config: { role: 'view', rateLimit: { max: tuning.hours_per_min, timeWindow: 60_000 } },
      schema: {
        operationId: 'hours',
        summary: 'Hours and energy left at given powers, from the present estimate',
        tags,
        params: unitParams,
        querystring: headroomQuery,
        response: { 200: unitHoursSchema.describe('An answer per power asked for'), ...faults },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      return askHours(service, now, request.query);
    },
  );

  app.get(
    '/api/units/:unit/sensors',
    {
      config: { role: 'view', rateLimit: { max: tuning.hours_per_min, timeWindow: 60_000 } },
      schema: {
        operationId: 'sensors',
        summary: 'What losing each thermocouple would do to sigma, and where one more would help',
        tags,
        params: unitParams,
        querystring: sensorsQuery,
        response: {
          200: unitWorthSchema.describe(
            'Takes seconds for the hours ahead, up to a minute for a day',
          ),
          ...faults,
        },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      const over = request.query.over ?? 'now';
      if (over === 'now' && now.estimate === null) throw noEstimate(now.unit.id);
      return askSensors(service, now, over);
    },
  );
};
