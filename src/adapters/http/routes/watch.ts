import { z } from 'zod';
import { cycleRows, cycleView } from '../../../core/watch/cycleView.js';
import { toCsv, wantsCsv } from '../csv.js';
import { faults, type Routes, unitOf } from '../routes.js';
import { watchHistoryQuery, watchHistorySchema } from '../schema/playback.js';
import { cyclesQuery, unitParams } from '../schema/questions.js';
import { cyclesSchema, watchSchema } from '../schema/watch.js';
import { ageOf, noEstimate } from '../views.js';
import { watchColumns } from '../watchColumns.js';
import { spanOf } from './history.js';

const MONTH_MS = 30 * 86_400_000;
const MOST = 500;
const POINTS = 200;

/** GET /api/units/{unit}/watch, .../watch/history, .../cycles */
export const watchRoutes: Routes = (app, { service }) => {
  const tags = ['watch'];

  app.get(
    '/api/units/:unit/watch',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'watch',
        summary: 'What the indicators show, and what is probably behind it',
        tags,
        params: unitParams,
        response: { 200: watchSchema.describe('Of the newest scan'), ...faults },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      const watch = service.watch(now.unit.id);
      if (watch === null) throw noEstimate(now.unit.id);
      const { time, unit, indicators, causes } = watch;
      return {
        ...{ time, unit, age_s: ageOf(now, time), stale: now.stale },
        indicators: indicators.map((indicator) => ({ ...indicator })),
        causes: causes.map((cause) => ({ ...cause, evidence: [...cause.evidence] })),
      };
    },
  );

  app.get(
    '/api/units/:unit/watch/history',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'watchHistory',
        summary: 'What the indicators showed over a span of time, as columns',
        description:
          'Stored every 10 minutes of source time and at each change of a state. Of more than ' +
          `\`points\` the last in each of so many equal stretches (${POINTS} unless asked otherwise). ` +
          'Without from and to: the 30 days before the newest estimate.',
        tags,
        params: unitParams,
        querystring: watchHistoryQuery,
        response: { 200: watchHistorySchema.describe('Oldest first'), ...faults },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      const unit = now.unit.id;
      const { points = POINTS, kinds } = request.query;
      const { from, to } = spanOf(request.query, now.estimate?.time, MONTH_MS);
      const { rows, thinned, every_ms } = service.watchHistory(unit, from, to, points);
      return {
        ...{ unit, from: new Date(from).toISOString(), to: new Date(to).toISOString() },
        ...{ thinned, every_s: every_ms / 1000 },
        ...watchColumns(rows, kinds),
      };
    },
  );

  app.get(
    '/api/units/:unit/cycles',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'cycles',
        summary: 'Charges, stands and discharges that are over: energies, losses, widths',
        description:
          'Runs that lie in the span or reach into it, oldest first; of more than ' +
          `${MOST} the newest. Without from and to: the 30 days before the newest estimate. ` +
          'CSV by ?format=csv or Accept: text/csv.',
        tags,
        params: unitParams,
        querystring: cyclesQuery,
        response: {
          200: {
            description: 'JSON, or CSV after RFC 4180',
            content: {
              'application/json': { schema: cyclesSchema },
              'text/csv': { schema: z.string() },
            },
          },
          ...faults,
        },
      },
    },
    async (request, reply) => {
      const now = unitOf(service, request.params.unit);
      const unit = now.unit.id;
      const { format, kind, indicators } = request.query;
      const { from, to } = spanOf(request.query, now.estimate?.time, MONTH_MS);
      const found = service.cycles(unit, from, to, kind, MOST + 1);
      const runs = found.slice(-MOST).map(cycleView);
      const cycles = indicators === 'no' ? runs.map((run) => ({ ...run, indicators: [] })) : runs;
      reply.header('vary', 'Accept');
      if (wantsCsv(format, request.headers.accept)) {
        const name = unit.replace(/[^\w.-]+/g, '_');
        reply.header('content-disposition', `attachment; filename="${name}-cycles.csv"`);
        reply.type('text/csv; charset=utf-8; header=present');
        const { columns, rows } = cycleRows(cycles);
        return toCsv(columns, rows);
      }
      const at = (time_ms: number) => new Date(time_ms).toISOString();
      reply.type('application/json; charset=utf-8');
      return { unit, from: at(from), to: at(to), older_left_out: found.length > MOST, cycles };
    },
  );
};
