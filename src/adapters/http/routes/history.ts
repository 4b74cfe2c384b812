import { z } from 'zod';
import { toCsv, wantsCsv } from '../csv.js';
import { HttpFault, wrongValue } from '../faults.js';
import { faults, type Routes, unitOf } from '../routes.js';
import { unitHistorySchema } from '../schema/answers.js';
import { historyQuery, unitParams } from '../schema/questions.js';
import type { HistoryPoint, PlantService, UnitNow } from '../service.js';

const DAY_MS = 86_400_000;
const POINTS = 500;

/**
 * A span of source time. It ends with the newest estimate unless told otherwise, so that a
 * recording of last year shows its own last day; without an estimate, with the clock.
 */
export function spanOf(
  query: { from?: number | undefined; to?: number | undefined },
  newest: string | undefined,
  usual_ms = DAY_MS,
): { from: number; to: number } {
  const to = query.to ?? (newest === undefined ? Date.now() : Date.parse(newest));
  const from = query.from ?? to - usual_ms;
  if (from < to) return { from, to };
  throw wrongValue(
    'from',
    new Date(from).toISOString(),
    `a time before "to", which is ${new Date(to).toISOString()}`,
  );
}

const EXTREME = /\.(min|max)$/;

/** The series asked for, else all but extremes. */
function chosenSeries(service: PlantService, now: UnitNow, asked: readonly string[] | undefined) {
  const known = service.historySeries(now.unit.id);
  if (asked === undefined) return known.filter((name) => !EXTREME.test(name));
  const unknown = asked.find((name) => !known.includes(name));
  if (unknown === undefined) return [...new Set(asked)];
  const expected = known.length > 0 ? `some of ${known.join(', ')}` : 'no series is stored yet';
  throw new HttpFault(
    400,
    'unknown_series',
    `unit ${now.unit.id} has no series ${JSON.stringify(unknown)}; ${expected}`,
    { field: 'series', value: unknown, expected },
  );
}

/** Series with their extremes after them, where they have any. */
function withExtremes(series: readonly string[], known: readonly string[]): string[] {
  const all = series.flatMap((name) => [name, `${name}.min`, `${name}.max`]);
  return [...new Set(all)].filter((name) => known.includes(name));
}

/** GET /api/units/{unit}/history as JSON or CSV. */
export const historyRoutes: Routes = (app, { service }) => {
  app.get(
    '/api/units/:unit/history',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'history',
        summary: 'Stored series of a unit, thinned evenly to a number of points',
        description:
          'Without from and to: the 24 h before the newest estimate. Of more rows than points one ' +
          'per stretch of equal length: the mean, with NAME.min and NAME.max; of words the last. CSV ' +
          'by ?format=csv or Accept: text/csv.',
        tags: ['history'],
        params: unitParams,
        querystring: historyQuery,
        response: {
          200: {
            description: 'JSON, or CSV after RFC 4180',
            content: {
              'application/json': { schema: unitHistorySchema },
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
      const { format, points = POINTS, series: asked } = request.query;
      const { from, to } = spanOf(request.query, now.estimate?.time);
      const series = chosenSeries(service, now, asked);
      const names = series.map((name) => name.replace(EXTREME, ''));
      const stored = service.history(unit, from, to, points, names);
      const thinned = stored.bucket_ms !== null;
      const columns = thinned ? withExtremes(series, service.historySeries(unit)) : series;
      const rows = stored.points.map((row): HistoryPoint => {
        // Of a single row the extremes are its value.
        const own = (name: string) => row[thinned ? name : name.replace(EXTREME, '')] ?? null;
        const values = columns.map((name) => [name, own(name)] as const);
        return { time: row.time, ...Object.fromEntries(values) };
      });
      reply.header('vary', 'Accept');
      if (wantsCsv(format, request.headers.accept)) {
        const name = unit.replace(/[^\w.-]+/g, '_');
        reply.header('content-disposition', `attachment; filename="${name}-history.csv"`);
        reply.type('text/csv; charset=utf-8; header=present');
        return toCsv(['time', ...columns], rows);
      }
      const at = (time_ms: number) => new Date(time_ms).toISOString();
      reply.type('application/json; charset=utf-8');
      const bucket_s = stored.bucket_ms === null ? null : stored.bucket_ms / 1000;
      return { unit, from: at(from), to: at(to), thinned, bucket_s, series, rows };
    },
  );
};
