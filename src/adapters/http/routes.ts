import type {
  FastifyBaseLogger,
  FastifyInstance,
  RawReplyDefaultExpression,
  RawRequestDefaultExpression,
  RawServerDefault,
} from 'fastify';
import type { ZodTypeProvider } from 'fastify-type-provider-zod';
import type { Entrance } from './auth.js';
import { type FaultCounts, unknownUnit } from './faults.js';
import type { JsonWriter } from './json.js';
import { faultSchema } from './schema/answers.js';
import type { PlantService, UnitNow } from './service.js';
import type { LiveStream } from './stream.js';
import type { HttpTuning } from './tuning.js';

export type HttpApp = FastifyInstance<
  RawServerDefault,
  RawRequestDefaultExpression,
  RawReplyDefaultExpression,
  FastifyBaseLogger,
  ZodTypeProvider
>;

export interface RouteContext {
  readonly service: PlantService;
  readonly stream: LiveStream;
  readonly json: JsonWriter;
  readonly tuning: HttpTuning;
  readonly entrance: Entrance;
  readonly faultCounts: FaultCounts;
  /** Connections that were ended at once, as there were too many. */
  connectionsRefused(): number;
  /** Connections ended as answers were not read. */
  unreadEnded(): number;
}

/** One group of routes, declared within the path prefix. */
export type Routes = (app: HttpApp, context: RouteContext) => void;

/** The unit of a path, or the 404 that names those there are. */
export function unitOf(service: PlantService, unit: string): UnitNow {
  const now = service.now(unit);
  if (now === undefined) throw unknownUnit(unit, service.unitIds(), 404);
  return now;
}

/** A unit named in a query or body: 400 where there is none. */
export function checkUnit(service: PlantService, unit: string | undefined): void {
  if (unit !== undefined && service.now(unit) === undefined) {
    throw unknownUnit(unit, service.unitIds(), 400);
  }
}

/** The documented answers beside the good one. */
export const faults = {
  '4xx': faultSchema.describe('The question is wrong: what, where and what was expected'),
  '5xx': faultSchema.describe('The question is right, but there is no answer: why'),
} as const;
