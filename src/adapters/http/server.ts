import { Access } from '../../access/access.js';
import type { HttpConfig } from '../../config/site.js';
import { RockhourError, reasonOf } from '../../errors.js';
import { createHttpApp, type HttpOptions, normalPrefix } from './app.js';
import { Servers } from './listening.js';
import type { HttpApp } from './routes.js';
import type { PlantService } from './service.js';
import { DEFAULT_TUNING } from './tuning.js';

export interface HttpServer {
  /** Listens; the url names the port that was given where port 0 was asked for. */
  start(): Promise<{ url: string }>;
  /** Ends all streams and stops listening; may be called twice. */
  stop(): Promise<void>;
}

/** HTTP API, live stream and page of one site. */
export function createHttpServer(
  service: PlantService,
  config: HttpConfig,
  options: HttpOptions,
): HttpServer {
  let app: HttpApp | null = null;
  const { log, tuning } = options;
  const { tls = null, tokens = [], login_by_proxy = false } = config;
  const servers = new Servers({ ...DEFAULT_TUNING, ...tuning }, tls, {
    info: (text) => log.info(text),
    error: (text) => log.error(text),
  });
  return {
    async start() {
      if (app !== null) throw new RangeError('start: the HTTP server has been started already');
      const built = await createHttpApp(service, config.path_prefix, {
        access: new Access(tokens),
        ...options,
        ...{ login_by_proxy, servers, isSecure: tls !== null },
      });
      app = built.app;
      // Before the first client: an event between listening and subscribing would be lost.
      built.stream.start();
      try {
        await app.listen({
          ...{ host: config.host, port: config.port },
          listenTextResolver: (address) => `page and API at ${address}`,
        });
      } catch (cause) {
        await this.stop();
        throw cannotListen(config, cause);
      }
      servers.start();
      return { url: urlOf(config, portOf(app) ?? config.port) };
    },
    async stop() {
      const closing = app;
      app = null;
      servers.stop();
      await closing?.close();
    },
  };
}

function portOf(app: HttpApp): number | undefined {
  const address = app.server.address();
  return typeof address === 'object' && address !== null ? address.port : undefined;
}

/** An address for people: where it listens on every interface, the local one. */
function urlOf({ host, path_prefix, tls }: HttpConfig, port: number): string {
  const local = host === '0.0.0.0' || host === '::' || host === '' ? 'localhost' : host;
  const name = local.includes(':') ? `[${local}]` : local;
  return `${tls ? 'https' : 'http'}://${name}:${port}${normalPrefix(path_prefix)}/`;
}

function cannotListen({ host, port }: HttpConfig, cause: unknown): RockhourError {
  const code = (cause as NodeJS.ErrnoException).code;
  const why =
    code === 'EADDRINUSE'
      ? 'another program listens there'
      : code === 'EACCES'
        ? 'this user may not listen there'
        : code === 'EADDRNOTAVAIL' || code === 'ENOTFOUND'
          ? 'this machine has no such address'
          : reasonOf(cause);
  return new RockhourError(
    'PORT_IN_USE',
    `cannot listen for HTTP on ${host}:${port} (http.host, http.port): ${why}`,
    { cause, advice: 'Stop the program that holds it, or set another http.port.' },
  );
}
