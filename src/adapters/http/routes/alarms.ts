import type { AlarmAction } from '../../../core/alarm/command.js';
import { RockhourError } from '../../../errors.js';
import { HttpFault, show } from '../faults.js';
import { checkUnit, faults, type Routes } from '../routes.js';
import {
  acknowledgeBody,
  alarmsQuery,
  figuresQuery,
  outOfServiceBody,
  shelveBody,
  transitionsQuery,
} from '../schema/alarmQuestions.js';
import {
  acknowledgedSchema,
  alarmsSchema,
  commandedSchema,
  figuresSchema,
  transitionsSchema,
} from '../schema/alarms.js';
import { eventsSchema } from '../schema/answers.js';
import { eventsQuery } from '../schema/questions.js';
import type { AlarmAnswer, PlantService } from '../service.js';
import { spanOf } from './history.js';

const MOST = 200;
const TAGS = ['alarms'];
const STATUS = { unknown_event: 404, wrong_state: 409, wrong_value: 400 } as const;

/** The newest estimate of the units asked about. */
function newestTime(service: PlantService, unit: string | undefined): string | undefined {
  const units = unit === undefined ? service.unitIds() : [unit];
  const times = units.flatMap((id) => service.now(id)?.estimate?.time ?? []);
  return times.sort().at(-1);
}

type Accepted = Extract<AlarmAnswer, { accepted: true }>;

/** @throws HttpFault where the command is not followed */
function follow(service: PlantService, action: AlarmAction, body: object): Accepted {
  const answer = commandOf(service, { ...body, action });
  if (answer.accepted) return answer;
  const { code, field, value, expected } = answer.fault;
  const words =
    code === 'unknown_event'
      ? `there is nothing to ${action.replaceAll('_', ' ')} under id ${show(value)}; ${expected}`
      : `${field ?? 'the body'} is ${show(value)}; expected ${expected}`;
  const detail = { ...(field === null ? {} : { field }), value, expected };
  throw new HttpFault(STATUS[code], code, words, detail);
}

/** @throws HttpFault 503 where the disk does not take it: nothing has changed, it may be tried again */
function commandOf(service: PlantService, command: object): AlarmAnswer {
  try {
    return service.commandAlarm(command);
  } catch (thrown) {
    if (!(thrown instanceof RockhourError)) throw thrown;
    const fault = new HttpFault(503, 'question_failed', `not recorded: ${thrown.message}`);
    fault.cause = thrown;
    throw fault;
  }
}

function commanded({ command: { id, action, who }, entry }: Accepted) {
  return { id, action, who, state: entry?.state ?? ('normal' as const), alarm: entry };
}

/** Lists: /api/alarms with its transitions and figures, /api/events. */
const listRoutes: Routes = (app, { service }) => {
  app.get(
    '/api/alarms',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'alarms',
        summary: 'Alarms and alerts with their states, what is shown apart from what is held back',
        tags: TAGS,
        querystring: alarmsQuery,
        response: { 200: alarmsSchema.describe('What stands'), ...faults },
      },
    },
    async (request) => {
      const { unit } = request.query;
      checkUnit(service, unit);
      const [standing, suppressed] = [service.standing(unit), service.heldBack(unit)];
      const counts: Record<string, number> = {};
      for (const { state } of [...standing, ...suppressed])
        counts[state] = (counts[state] ?? 0) + 1;
      return { standing, suppressed, counts, shelve_most_h: service.shelveMost_h };
    },
  );

  app.get(
    '/api/alarms/transitions',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'alarmTransitions',
        summary: 'Every change of state: when, by whom and why; newest first',
        description: 'Without from and to: the 24 h before the newest estimate.',
        tags: TAGS,
        querystring: transitionsQuery,
        response: { 200: transitionsSchema.describe('Transitions in the span'), ...faults },
      },
    },
    async (request) => {
      const { unit, id, most = MOST } = request.query;
      checkUnit(service, unit);
      const { from, to } = spanOf(request.query, newestTime(service, unit));
      return {
        from: new Date(from).toISOString(),
        to: new Date(to).toISOString(),
        transitions: service.alarmTransitions({ unit, id }, from, to, most),
      };
    },
  );

  app.get(
    '/api/alarms/figures',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'alarmFigures',
        summary: 'Rates, floods, chattering, stale and most frequent alarms, after ISA-18.2',
        description: 'Without from and to: the 24 h before the newest estimate.',
        tags: TAGS,
        querystring: figuresQuery,
        response: { 200: figuresSchema.describe('Figures over the span'), ...faults },
      },
    },
    async (request) => {
      const { unit } = request.query;
      checkUnit(service, unit);
      const { from, to } = spanOf(request.query, newestTime(service, unit));
      const report = service.alarmReport(unit, from, to);
      // Lists of a report are read-only; an answer's are not, to the type of the schema.
      return structuredClone(report) as Mutable<typeof report>;
    },
  );

  app.get(
    '/api/events',
    {
      config: { role: 'view' },
      schema: {
        operationId: 'events',
        summary: 'Alarms and alerts raised and returned',
        description: 'Without from and to: the 24 h before the newest estimate.',
        tags: TAGS,
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
};

type Mutable<T> = T extends readonly (infer E)[]
  ? Mutable<E>[]
  : T extends object
    ? { -readonly [K in keyof T]: Mutable<T[K]> }
    : T;

/** What only a name is asked for, and the least role. */
const PLAIN = [
  ['unshelve', 'unshelve', 'Show it again before its time on the shelf is over', 'acknowledge'],
  [
    'return-to-service',
    'return_to_service',
    'Take an alarm or alert back into service',
    'configure',
  ],
  [
    'reset',
    'reset',
    'Release a latched alarm or alert that has returned and was acknowledged',
    'acknowledge',
  ],
] as const;

/**
 * What a person does: acknowledge, shelve, out of service and back. Nothing changes at the plant. To
 * take out of service has no end by itself: it changes what is watched, and is for `configure`.
 */
const commandRoutes: Routes = (app, { service }) => {
  const response = { 200: commandedSchema.describe('Recorded'), ...faults };

  app.post(
    '/api/alarms/acknowledge',
    {
      config: { role: 'acknowledge' },
      schema: {
        operationId: 'acknowledge',
        summary: 'Acknowledge an alarm or alert',
        description: 'Recorded with the name given; it changes nothing at the plant.',
        tags: TAGS,
        body: acknowledgeBody,
        response: { 200: acknowledgedSchema.describe('Recorded'), ...faults },
      },
    },
    async (request) => {
      const accepted = follow(service, 'acknowledge', request.body);
      const { entry, command } = accepted;
      const acknowledged_by = entry?.acknowledged_by ?? command.who;
      return { ...commanded(accepted), acknowledged_by, standing: entry };
    },
  );

  app.post(
    '/api/alarms/shelve',
    {
      config: { role: 'acknowledge' },
      schema: {
        operationId: 'shelve',
        summary: 'Hide an alarm or alert for some hours',
        description: 'It is shown again, unacknowledged, when the time is over and it stands.',
        tags: TAGS,
        body: shelveBody,
        response,
      },
    },
    async (request) => commanded(follow(service, 'shelve', request.body)),
  );

  app.post(
    '/api/alarms/out-of-service',
    {
      config: { role: 'configure' },
      schema: {
        operationId: 'out_of_service',
        summary: 'Take an alarm or alert out of service until it is taken back',
        tags: TAGS,
        body: outOfServiceBody,
        response,
      },
    },
    async (request) => commanded(follow(service, 'out_of_service', request.body)),
  );

  for (const [path, action, summary, role] of PLAIN) {
    app.post(
      `/api/alarms/${path}`,
      {
        config: { role },
        schema: { operationId: action, summary, tags: TAGS, body: acknowledgeBody, response },
      },
      async (request) => commanded(follow(service, action, request.body)),
    );
  }
};

/** GET and POST below /api/alarms, GET /api/events */
export const alarmRoutes: Routes = (app, context) => {
  listRoutes(app, context);
  commandRoutes(app, context);
};
