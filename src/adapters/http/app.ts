import { existsSync } from 'node:fs';
import { join } from 'node:path';
import helmet from '@fastify/helmet';
import { fastifySSE } from '@fastify/sse';
import fastifyStatic from '@fastify/static';
import swagger from '@fastify/swagger';
import fastify, {
  type FastifyBaseLogger,
  type FastifyReply,
  type FastifyRequest,
  LogController,
} from 'fastify';
import { validatorCompiler, type ZodTypeProvider } from 'fastify-type-provider-zod';
import { Access } from '../../access/access.js';
import { LoginFailures } from '../../access/failures.js';
import { addGuard, type Entrance, type Guard } from './auth.js';
import { errorHandler } from './error-answer.js';
import { FaultCounts, HttpFault } from './faults.js';
import { JsonWriter } from './json.js';
import { answerClientError, type Servers } from './listening.js';
import { transformSchemas } from './openapi.js';
import { addRates, countRefused } from './rates.js';
import { alarmRoutes } from './routes/alarms.js';
import { backupRoutes } from './routes/backup.js';
import { historyRoutes } from './routes/history.js';
import { loginRoutes } from './routes/login.js';
import { offerRoutes } from './routes/offers.js';
import { planRoutes } from './routes/plan.js';
import { profileRoutes } from './routes/profiles.js';
import { reportRoutes } from './routes/report.js';
import { rewindRoutes } from './routes/rewinds.js';
import { scheduleRoutes } from './routes/schedule.js';
import { statusRoutes } from './routes/status.js';
import { streamRoutes } from './routes/stream.js';
import { unitRoutes } from './routes/units.js';
import { watchRoutes } from './routes/watch.js';
import type { HttpApp, RouteContext } from './routes.js';
import type { PlantService } from './service.js';
import { LiveStream } from './stream.js';
import { DEFAULT_TUNING, type HttpTuning } from './tuning.js';

export interface HttpOptions {
  readonly log: FastifyBaseLogger;
  /** Folder of the built page. */
  readonly pageFolder: string;
  readonly tuning?: Partial<HttpTuning>;
  /** Who may come in; without it everybody on this machine. */
  readonly access?: Access;
  readonly login_by_proxy?: boolean;
  /** Makes the servers that listen, with TLS where that is on. */
  readonly servers?: Servers;
  readonly isSecure?: boolean;
}

/** `rockhour/`, `/rockhour/` -> `/rockhour`; `` and `/` -> ``. */
export function normalPrefix(prefix: string): string {
  const bare = prefix.replace(/^\/+|\/+$/g, '');
  return bare === '' ? '' : `/${bare}`;
}

/**
 * The page may load nothing but its own files, from its own place, and may not be framed. HSTS is
 * sent where rockhour itself speaks TLS. COOP and Origin-Agent-Cluster are left out: over plain HTTP,
 * usual inside a plant's network, browsers ignore them with a console message, as they do HSTS.
 */
const securityHeaders = (isSecure: boolean) => ({
  contentSecurityPolicy: {
    useDefaults: false,
    directives: {
      defaultSrc: ["'none'"],
      scriptSrc: ["'self'"],
      styleSrc: ["'self'"],
      imgSrc: ["'self'"],
      connectSrc: ["'self'"],
      baseUri: ["'none'"],
      formAction: ["'none'"],
      frameAncestors: ["'none'"],
    },
  },
  // Half a year; names below this host's are not rockhour's to speak for.
  strictTransportSecurity: isSecure && { maxAge: 15_768_000, includeSubDomains: false },
  crossOriginOpenerPolicy: false,
  originAgentCluster: false,
  referrerPolicy: { policy: 'no-referrer' as const },
});

async function addPlugins(app: HttpApp, prefix: string, context: RouteContext): Promise<Guard> {
  const { entrance } = context;
  await app.register(helmet, securityHeaders(entrance.isSecure));
  // Before the rates, which are counted by token, and before every route.
  const guard = addGuard(app, entrance);
  await addRates(app, context.tuning.questions_per_min);
  // Awaited: the plugin takes in only routes that are declared after it.
  await app.register(fastifySSE, { serializer: context.json.write });
  await app.register(swagger, {
    openapi: {
      openapi: '3.1.0',
      info: {
        title: 'rockhour',
        version: context.service.version,
        description:
          'Front positions, stored energy and remaining discharge hours of packed-bed stores. ' +
          'rockhour advises; it trips nothing and writes nothing to the control system. Every ' +
          'answer that is not a success has the body {"error": {code, message, field, value, ' +
          'expected}}.',
      },
      servers: [{ url: prefix === '' ? '/' : prefix }],
    },
    transform: transformSchemas,
  });
  return guard;
}

async function addPage(app: HttpApp, prefix: string, folder: string): Promise<void> {
  // The page has no figures in itself: it asks for them, and logs in for that.
  const hide = { schema: { hide: true } };
  if (prefix !== '') {
    app.get(prefix, hide, async (_request, reply) => reply.redirect(`${prefix}/`, 308));
  }
  if (!existsSync(join(folder, 'index.html'))) {
    app.get(`${prefix}/`, hide, async () => {
      throw new HttpFault(503, 'page_not_built', 'the page has not been built; the API is there', {
        expected: 'npm run build before the start',
      });
    });
    return;
  }
  await app.register(fastifyStatic, {
    root: folder,
    prefix: `${prefix}/`,
    wildcard: false,
    cacheControl: false,
    decorateReply: false,
    setHeaders: (reply, path) => {
      // Files under assets/ have a hash of their content in the name.
      const forever = /[\\/]assets[\\/]/.test(path);
      reply.header('cache-control', forever ? 'public, max-age=31536000, immutable' : 'no-cache');
    },
  });
}

/** Builds the app without listening; the stream has still to be started. */
export async function createHttpApp(
  service: PlantService,
  pathPrefix: string,
  options: HttpOptions,
): Promise<{ app: HttpApp; stream: LiveStream }> {
  const prefix = normalPrefix(pathPrefix);
  const tuning = { ...DEFAULT_TUNING, ...options.tuning };
  const { servers } = options;
  const json = new JsonWriter();
  const stream = new LiveStream(service, json, tuning);
  const entrance: Entrance = {
    access: options.access ?? new Access(),
    failures: new LoginFailures(tuning.wrong_tokens_per_min),
    login_by_proxy: options.login_by_proxy ?? false,
    prefix,
    isSecure: options.isSecure ?? false,
  };
  const context: RouteContext = {
    service,
    stream,
    json,
    tuning,
    entrance,
    faultCounts: new FaultCounts(),
    connectionsRefused: () => servers?.refused ?? 0,
    unreadEnded: () => servers?.unreadEnded ?? 0,
  };

  const onError = errorHandler(context.faultCounts);
  const app: HttpApp = fastify({
    loggerInstance: options.log,
    logController: new LogController({ disableRequestLogging: true }),
    bodyLimit: 16 * 1024,
    forceCloseConnections: true,
    clientErrorHandler: answerClientError,
    // Before any route: an address that cannot be decoded.
    frameworkErrors: (error, request, reply) => {
      const answer = reply as unknown as FastifyReply;
      answer.send(onError(error, request as unknown as FastifyRequest, answer));
    },
    ...(servers === undefined ? {} : { serverFactory: servers.make }),
  }).withTypeProvider<ZodTypeProvider>();
  app.removeContentTypeParser('text/plain');
  app.setValidatorCompiler(validatorCompiler);
  // The schemas of the answers document and type them; a test holds every answer against them.
  app.setSerializerCompiler(() => json.write);
  app.setReplySerializer((payload) => json.write(payload));
  app.setErrorHandler(onError);
  app.setNotFoundHandler(async (request, reply) => {
    await countRefused(request, reply);
    throw new HttpFault(
      404,
      'unknown_route',
      `there is nothing at ${request.method} ${request.url}`,
      {
        field: 'path',
        value: request.url,
        expected: `a route of ${prefix}/api/openapi.json`,
      },
    );
  });

  const guard = await addPlugins(app, prefix, context);
  await app.register(
    async (scope) => {
      const typed = scope.withTypeProvider<ZodTypeProvider>() as HttpApp;
      typed.addHook('onSend', async (_request, reply) => {
        if (!reply.hasHeader('cache-control')) reply.header('cache-control', 'no-store');
      });
      for (const add of [
        loginRoutes,
        statusRoutes,
        unitRoutes,
        profileRoutes,
        planRoutes,
        offerRoutes,
        scheduleRoutes,
        historyRoutes,
        watchRoutes,
        rewindRoutes,
        reportRoutes,
        alarmRoutes,
        backupRoutes,
        streamRoutes,
      ]) {
        add(typed, context);
      }
    },
    { prefix },
  );
  await guard.publicly(() => addPage(app, prefix, options.pageFolder));
  app.addHook('preClose', async () => stream.stop());
  return { app, stream };
}
