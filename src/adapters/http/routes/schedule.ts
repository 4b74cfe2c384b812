import { z } from 'zod';
import type { UnitDefinition } from '../../../core/definitions.js';
import {
  type Block,
  type Fault,
  readBlocks,
  type WrittenBlock,
} from '../../../core/plan/scheduleAsk.js';
import { csvPath, readScheduleCsv } from '../../../core/plan/scheduleCsv.js';
import { wantsCsv } from '../csv.js';
import { HttpFault, show } from '../faults.js';
import { askPlan, requireEstimate } from '../planHead.js';
import { faults, type Routes, unitOf } from '../routes.js';
import { scheduleTable } from '../scheduleTable.js';
import { unitParams } from '../schema/questions.js';
import { BODY, scheduleBody, scheduleQuery, scheduleSchema } from '../schema/schedule.js';

/** 400 blocks with room to spare [bytes]. */
const BODY_LIMIT = 256 * 1024;
const USUAL_CERTAINTY = 0.9;

function noBody(): HttpFault {
  const message = `body is missing; expected ${BODY}`;
  return new HttpFault(400, 'wrong_value', message, { field: 'body', value: null, expected: BODY });
}

function refuse(found: readonly Fault[]): HttpFault {
  const [{ field, value, expected }, ...others] = found as [Fault, ...Fault[]];
  const message = `${field} is ${show(value)}; expected ${expected}`;
  return new HttpFault(400, 'wrong_value', message, { field, value, expected, others });
}

/**
 * @param body text of a CSV, or the blocks of a JSON body
 * @param asked_ms the wall clock, in source time
 */
function blocksOf(
  body: string | readonly WrittenBlock[],
  zone: string | null,
  now_ms: number,
  asked_ms: number,
): readonly Block[] {
  let written: readonly WrittenBlock[];
  let path: ReturnType<typeof csvPath> | undefined;
  if (typeof body === 'string') {
    const csv = readScheduleCsv(body);
    if ('faults' in csv) throw refuse(csv.faults);
    written = csv.blocks;
    path = csvPath(csv.rows);
  } else written = body;
  const read = readBlocks(written, zone, now_ms, path, asked_ms);
  if ('faults' in read) throw refuse(read.faults);
  return read.blocks;
}

const zoneOf = (unit: UnitDefinition): string | null => unit.limits.connection?.time_zone ?? null;

/** POST /api/units/{unit}/schedule, JSON or CSV in and out. */
export const scheduleRoutes: Routes = (app, { service, tuning }) => {
  app.addContentTypeParser(
    'text/csv',
    { parseAs: 'string', bodyLimit: BODY_LIMIT },
    (_request, body, done) => done(null, body),
  );

  app.post(
    '/api/units/:unit/schedule',
    {
      bodyLimit: BODY_LIMIT,
      config: { role: 'view', rateLimit: { max: tuning.hours_per_min, timeWindow: 60_000 } },
      schema: {
        operationId: 'schedule',
        summary: 'Whether a schedule holds, where it first falls short, and the nearest that does',
        description:
          'JSON, or CSV after RFC 4180 (content-type text/csv) with the header ' +
          'from,to,mode,power_MW_el; certainty, zone, stale and format then stand in the query. ' +
          'Times have an offset or are local to the zone; one that a change of the clocks leaves ' +
          'out or shows twice is refused. Between blocks the unit stands.',
        tags: ['ahead'],
        params: unitParams,
        querystring: scheduleQuery,
        body: {
          content: {
            'application/json': { schema: scheduleBody },
            'text/csv': { schema: z.string() },
          },
        },
        response: {
          200: {
            description: 'JSON, or CSV with one row per block',
            content: {
              'application/json': { schema: scheduleSchema },
              'text/csv': { schema: z.string() },
            },
          },
          ...faults,
        },
      },
    },
    async (request, reply) => {
      const now = unitOf(service, request.params.unit);
      const body = request.body as z.output<typeof scheduleBody> | string | undefined;
      // A question without a body has no content type, and so no schema that it is held against.
      if (body === undefined || body === null) throw noBody();
      const json = typeof body === 'string' ? null : body;
      const stale = json?.stale ?? request.query.stale;
      const zone = json?.zone ?? request.query.zone ?? zoneOf(now.unit);
      const certainty = json?.certainty ?? request.query.certainty ?? USUAL_CERTAINTY;
      const estimate = requireEstimate(now, stale);
      const now_ms = Date.parse(estimate.time);
      const asked_ms = now_ms + Math.max(0, Math.round((now.age_s ?? 0) * 1000));
      const blocks = blocksOf(json?.blocks ?? (body as string), zone, now_ms, asked_ms);
      const question = { kind: 'schedule', ask: { blocks, certainty, zone, asked_ms } } as const;
      const { head, answer } = await askPlan(service, now, stale, question);
      reply.header('vary', 'Accept');
      if (wantsCsv(json?.format ?? request.query.format, request.headers.accept)) {
        const name = now.unit.id.replace(/[^\w.-]+/g, '_');
        reply.header('content-disposition', `attachment; filename="${name}-schedule.csv"`);
        reply.type('text/csv; charset=utf-8; header=present');
        return scheduleTable(head, answer);
      }
      reply.type('application/json; charset=utf-8');
      return { ...head, ...answer };
    },
  );
};
