import { z } from 'zod';
import type { Holder } from '../../../access/access.js';
import { offerTable } from '../../../core/plan/offerTable.js';
import { requireRole } from '../auth.js';
import { wantsCsv } from '../csv.js';
import { HttpFault } from '../faults.js';
import { offersCsv } from '../offerCsv.js';
import { bodyOfQuery, offersAsk } from '../offerQuestion.js';
import { askPlan, requireEstimate } from '../planHead.js';
import { faults, type Routes, unitOf } from '../routes.js';
import { offersHistorySchema, offersReportSchema, offersSchema } from '../schema/offers.js';
import { keptParams, offersBody, offersHistoryQuery, offersQuery } from '../schema/offersAsk.js';
import { unitParams } from '../schema/questions.js';
import type { PlantService, UnitNow } from '../service.js';
import { spanOf } from './history.js';

const MOST_TABLES = 100;
const TESTED_BY =
  'The unit followed the plan (or stood) until the start in nine scans of ten, then discharged from ' +
  'within 15 min of the first power offered, at a median power within 5 % of it, until a rule ended ' +
  'it: in its last 10 min an outlet within 3 K of its limit or the flow within 2 % of the greatest. ' +
  'Of several offers that one discharge tests, the last asked before it counts.';

const at = (ms: number): string => new Date(ms).toISOString();

/** Answers an offer table, and keeps it where that is asked. */
async function answerOffers(
  service: PlantService,
  holder: Holder | null,
  now: UnitNow,
  body: z.output<typeof offersBody>,
  of: 'query' | 'body',
) {
  // A kept table is a promise on record: not for whoever may only look.
  if (body.keep) requireRole(holder, 'acknowledge');
  const { unit } = now;
  const estimate = requireEstimate(now, body.stale);
  const now_ms = Date.parse(estimate.time);
  const asked_ms = now_ms + (now.age_s ?? 0) * 1000;
  const ask = offersAsk(unit, body, now_ms, asked_ms, of);
  const question = { kind: 'offers', ask } as const;
  const { head, answer } = await askPlan(service, now, body.stale, question);
  const zone = unit.limits.connection?.time_zone ?? null;
  const table = { ...head, ...offerTable(answer, ask, Date.parse(head.time), zone) };
  const kept = body.keep ? service.keepOffers(unit.id, asked_ms, ask, table) : null;
  return { ...table, kept };
}

/** POST and GET /api/units/{unit}/offers, GET .../offers/history, .../history/{no}, .../report */
export const offerRoutes: Routes = (app, { service, tuning }) => {
  const tags = ['ahead'];
  const config = {
    role: 'view',
    rateLimit: { max: tuning.hours_per_min, timeWindow: 60_000 },
  } as const;
  const content = {
    200: {
      description: 'JSON, or CSV after RFC 4180 by format=csv or Accept: text/csv',
      content: {
        'application/json': { schema: offersSchema },
        'text/csv': { schema: z.string() },
      },
    },
    ...faults,
  };
  type Table = Awaited<ReturnType<typeof answerOffers>>;
  const csvOf = (table: Table): string => offersCsv(table, table);

  app.post(
    '/api/units/:unit/offers',
    {
      config,
      schema: {
        operationId: 'offers',
        summary: 'What the unit can sell: energy per power, start and block at any certainty',
        description:
          'Each block alone is given whatever becomes of the plan before it; jointly, with the plan ' +
          'and all blocks before. For one discharge without a plan the two are the same: who runs ' +
          'through a block has run through all before it. Kept, unless keep is false.',
        tags,
        params: unitParams,
        body: offersBody,
        response: content,
      },
    },
    async (request, reply) => {
      const now = unitOf(service, request.params.unit);
      const table = await answerOffers(service, request.holder, now, request.body, 'body');
      reply.header('vary', 'Accept');
      if (!wantsCsv(request.body.format, request.headers.accept)) return table;
      reply.type('text/csv; charset=utf-8; header=present');
      return csvOf(table);
    },
  );

  app.get(
    '/api/units/:unit/offers',
    {
      config,
      schema: {
        operationId: 'offersSimple',
        summary: 'What the unit can sell if it stands until then; kept with keep=true',
        tags,
        params: unitParams,
        querystring: offersQuery,
        response: content,
      },
    },
    async (request, reply) => {
      const now = unitOf(service, request.params.unit);
      const { query } = request;
      const table = await answerOffers(service, request.holder, now, bodyOfQuery(query), 'query');
      reply.header('vary', 'Accept');
      if (!wantsCsv(query.format, request.headers.accept)) return table;
      reply.type('text/csv; charset=utf-8; header=present');
      return csvOf(table);
    },
  );

  app.get(
    '/api/units/:unit/offers/history',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'offersHistory',
        summary: 'Offer tables that were kept, by the time of asking',
        description: 'Without from and to: the last 24 h.',
        tags: ['history'],
        params: unitParams,
        querystring: offersHistoryQuery,
        response: { 200: offersHistorySchema.describe('Kept tables, newest first'), ...faults },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      const { from, to } = askedSpan(request.query, now);
      // One more, to tell whether there are more.
      const found = service.keptOffers(now.unit.id, from, to, MOST_TABLES + 1);
      const tables = found.slice(0, MOST_TABLES);
      return {
        ...{ unit: now.unit.id, from: at(from), to: at(to) },
        tables: tables.map(({ no, asked_ms, time_ms, asked, offers }) => ({
          ...{ no, asked: at(asked_ms), time: at(time_ms), block_s: asked.block_s },
          offers: [...offers],
        })),
        older_left_out: found.length > MOST_TABLES,
      };
    },
  );

  app.get(
    '/api/units/:unit/offers/history/:no',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'offersKept',
        summary: 'A kept offer table as it was answered',
        tags: ['history'],
        params: keptParams,
        response: { 200: offersSchema.describe('As it was answered then'), ...faults },
      },
    },
    async (request) => {
      const { no } = request.params;
      const now = unitOf(service, request.params.unit);
      const found = service.answeredOffers(now.unit.id, no);
      if (found !== null) return { ...found, kept: no } as unknown as z.output<typeof offersSchema>;
      const expected = 'a number that GET .../offers/history lists';
      throw new HttpFault(
        404,
        'unknown_offers',
        `no offer table of unit ${now.unit.id} is kept under ${no}; expected ${expected}`,
        { field: 'no', value: no, expected },
      );
    },
  );

  app.get(
    '/api/units/:unit/offers/report',
    {
      config,
      schema: {
        operationId: 'offersReport',
        summary: 'Past p90 and p50 against what was then delivered',
        description: 'Of kept tables by the time of asking; without from and to: the last 30 days.',
        tags: ['history'],
        params: unitParams,
        querystring: offersHistoryQuery,
        response: { 200: offersReportSchema.describe('How often each was kept'), ...faults },
      },
    },
    async (request) => {
      const now = unitOf(service, request.params.unit);
      const { from, to } = askedSpan(request.query, now, 30);
      const report = await service.offerReport(now.unit.id, from, to);
      const interval = ({ interval: given, ...kept }: typeof report.p90) => ({
        ...kept,
        interval: given === null ? null : ([...given] as [number, number]),
      });
      return {
        ...{ unit: now.unit.id, from: at(from), to: at(to), tested_by: TESTED_BY },
        ...{ tables: report.tables, older_left_out: report.older_left_out },
        p90: interval(report.p90),
        p50: interval(report.p50),
        tested: report.tested.map(({ asked_ms, begins_ms, ...one }) => ({
          ...{ ...one, asked: at(asked_ms), begins: at(begins_ms) },
        })),
        untested: report.untested,
      };
    },
  );
};

const DAY_MS = 86_400_000;

/** As `spanOf`; asking goes on after the newest estimate, until that has an age. */
function askedSpan(
  query: { from?: number | undefined; to?: number | undefined },
  now: UnitNow,
  days = 1,
): { from: number; to: number } {
  const newest = now.estimate === null ? Date.now() : Date.parse(now.estimate.time);
  const to = query.to ?? Math.ceil(newest + (now.age_s ?? 0) * 1000) + 1;
  return spanOf({ from: query.from ?? to - days * DAY_MS, to }, undefined);
}
