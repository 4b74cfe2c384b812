import { HttpFault } from '../faults.js';
import { checkUnit, faults, type Routes } from '../routes.js';
import { acknowledgedSchema, alarmsSchema, eventsSchema } from '../schema/answers.js';
import { acknowledgeBody, alarmsQuery, eventsQuery } from '../schema/questions.js';
import type { PlantService } from '../service.js';
import { spanOf } from './history.js';

const MOST = 200;

/** The newest estimate of the units asked about. */
function newestTime(service: PlantService, unit: string | undefined): string | undefined {
  const units = unit === undefined ? service.unitIds() : [unit];
  const times = units.flatMap((id) => service.now(id)?.estimate?.time ?? []);
  return times.sort().at(-1);
}

/** GET /api/alarms, GET /api/events, POST /api/alarms/acknowledge */
export const alarmRoutes: Routes = (app, { service, stream }) => {
  const tags = ['alarms'];

  app.get(
    '/api/alarms',
    {
      schema: {
        operationId: 'alarms',
        summary: 'Alarms and alerts that stand, or have returned unacknowledged',
        tags,
        querystring: alarmsQuery,
        response: { 200: alarmsSchema.describe('What stands'), ...faults },
      },
    },
    async (request) => {
      checkUnit(service, request.query.unit);
      return { standing: service.standing(request.query.unit) };
    },
  );

  app.get(
    '/api/events',
    {
      schema: {
        operationId: 'events',
        summary: 'Alarms and alerts raised and returned',
        description: 'Without from and to: the 24 h before the newest estimate.',
        tags,
        querystring: eventsQuery,
        response: { 200: eventsSchema.describe('Events in the span'), ...faults },
      },
    },
    async (request) => {
      const { unit, most = MOST } = request.query;
      checkUnit(service, unit);
      const { from, to } = spanOf(request.query, newestTime(service, unit));
      return {
        from: new Date(from).toISOString(),
        to: new Date(to).toISOString(),
        events: service.events(unit, from, to, most),
      };
    },
  );

  app.post(
    '/api/alarms/acknowledge',
    {
      schema: {
        operationId: 'acknowledge',
        summary: 'Acknowledge an alarm or alert',
        description: 'Recorded with the name given; it changes nothing at the plant.',
        tags,
        body: acknowledgeBody,
        response: { 200: acknowledgedSchema.describe('Recorded'), ...faults },
      },
    },
    async (request) => {
      const { id, who } = request.body;
      if (!service.acknowledge(id, who)) {
        const ids = service.standing().map((event) => event.id);
        const expected =
          ids.length > 0 ? `one of ${ids.slice(0, 20).join(', ')}` : 'none stands at present';
        throw new HttpFault(
          404,
          'unknown_event',
          `there is nothing to acknowledge under id ${JSON.stringify(id)}; ${expected}`,
          { field: 'id', value: id, expected },
        );
      }
      stream.standingChanged();
      const standing = service.standing().find((event) => event.id === id) ?? null;
      return { id, acknowledged_by: who, standing };
    },
  );
};
