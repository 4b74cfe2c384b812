import { request as ask, type IncomingMessage } from 'node:http';
import { request as askSecurely } from 'node:https';
import { InfluxDB, type IPoint, type IPoolOptions } from 'influx';
import { clientTlsOptions } from '../../access/tls.js';
import type { InfluxConfig } from '../../config/site.js';
import { reasonOf, withoutCredentials } from '../../errors.js';
import { pointsOf, withdrawalOf } from './influxPoints.js';
import type { Outbox, Withdrawal } from './outbox.js';

export const FORWARDER_COUNTS = [
  'influx_points',
  'influx_failures',
  /** Points that are refused for good (400, 413): left out, so that the rest can go on. */
  'influx_set_aside',
] as const;
export type ForwarderCount = (typeof FORWARDER_COUNTS)[number];

export interface ForwarderOptions {
  readonly config: InfluxConfig;
  readonly outbox: () => Outbox;
  count(name: ForwarderCount, by: number): void;
  /** Cannot be written to, and why: once per outage. */
  down(reason: string): void;
  up(): void;
  /** Points that were set aside, and what InfluxDB said. */
  refused(reason: string): void;
}

/** A hung server is given up after this [ms]; the write may still be applied, and is repeated. */
const REQUEST_TIMEOUT_MS = 5000;
/** Pause between looks at an empty outbox, and the shortest and longest after a failure [ms]. */
const IDLE_MS = 500;
const RETRY_LEAST_MS = 500;
const RETRY_MOST_MS = 30_000;
/** Items read at a time; an estimate becomes some twenty points. */
const ITEMS = 500;

/** With one host the client's own back-off only refuses without asking, and its timer outlives us. */
const NO_BACKOFF = { getDelay: () => 0, next: () => NO_BACKOFF, reset: () => NO_BACKOFF };

/**
 * Copies the history to InfluxDB 1.x, in order, at least once, behind a cursor in SQLite. Same
 * series and timestamp overwrite, so a repeated write changes nothing. Retried: no connection, no
 * answer, 5xx, a login that is refused. Halved: a batch that is called a bad request (400) or too
 * large (413), also by a proxy; set aside: a single point that still is. On 404 the database is created.
 */
export class InfluxForwarder {
  private influx: InfluxDB | null = null;
  private timer: NodeJS.Timeout | null = null;
  private round: Promise<void> = Promise.resolve();
  private retry_ms = RETRY_LEAST_MS;
  private reason: string | null = null;
  private hasWritten = false;

  constructor(private readonly options: ForwarderOptions) {}

  /** Why nothing can be written now, null while all is well. */
  get trouble(): string | null {
    return this.reason;
  }

  /** False before the first successful write or ping. */
  get proven(): boolean {
    return this.hasWritten;
  }

  start(): void {
    if (this.influx) return;
    this.influx = makeClient(this.options.config);
    this.schedule(0);
  }

  /** Lets a write under way end, but does not wait long for it: it will be repeated. */
  async stop(): Promise<void> {
    if (this.timer) clearTimeout(this.timer);
    this.timer = null;
    this.influx = null;
    let limit: NodeJS.Timeout | undefined;
    const inTime = new Promise<void>((resolve) => {
      limit = setTimeout(resolve, 1000);
    });
    await Promise.race([this.round, inTime]);
    clearTimeout(limit);
  }

  private schedule(delay_ms: number): void {
    if (!this.influx) return;
    this.timer = setTimeout(() => {
      this.round = this.run();
    }, delay_ms);
  }

  private async run(): Promise<void> {
    const { influx } = this;
    if (!influx) return;
    try {
      const more = await this.forward(influx);
      if (this.influx !== influx) return;
      this.succeeded();
      this.schedule(more ? 0 : IDLE_MS);
    } catch (thrown) {
      if (this.influx !== influx) return;
      this.failed(complaintOf(thrown));
      this.schedule(this.retry_ms);
      this.retry_ms = Math.min(RETRY_MOST_MS, this.retry_ms * 2);
    }
  }

  /** Writes one batch; true where more may wait. */
  private async forward(influx: InfluxDB): Promise<boolean> {
    const outbox = this.options.outbox();
    const items = outbox.read(ITEMS);
    if (items.length === 0) {
      // With nothing to write an outage would go unseen, and a first start unproven.
      if (!this.hasWritten || this.reason !== null) await ping(this.options.config);
      return false;
    }
    const points: IPoint[] = [];
    let seq = outbox.cursor;
    for (const item of items) {
      if (item.kind === 'withdrawal') {
        // What was entered before it is to be there, and gone with it.
        if (points.length === 0 && seq === outbox.cursor) {
          await this.withdraw(influx, item);
          seq = item.seq;
        }
        break;
      }
      const next = pointsOf(item);
      if (points.length > 0 && points.length + next.length > this.options.config.batch_points) {
        break;
      }
      points.push(...next);
      seq = item.seq;
    }
    const refusals: string[] = [];
    const written = await this.write(influx, points, refusals);
    // Stopped meanwhile, the outbox may be closed: the batch is repeated after the next start.
    if (this.influx !== influx) return false;
    outbox.moveTo(seq);
    this.options.count('influx_points', written);
    // Once the whole batch is through: where a later half fails, it is repeated and refused again.
    for (const reason of refusals) this.setAside(reason);
    return true;
  }

  /** Deletes what was made again since; what the server will not delete is told, as points are. */
  private async withdraw(influx: InfluxDB, item: Withdrawal): Promise<void> {
    try {
      // The client asks by GET, which InfluxDB 1.x follows with a warning.
      await influx.query(withdrawalOf(item), { database: this.options.config.database });
    } catch (thrown) {
      const reason = complaintOf(thrown);
      // Before the first point there is no database, and nothing to be deleted.
      if (/database not found/.test(reason)) return;
      if (statusOf(thrown) !== 400 && !/Error from InfluxDB/.test(reason)) throw thrown;
      this.setAside(reason);
    }
  }

  private setAside(reason: string): void {
    this.options.count('influx_set_aside', 1);
    this.options.refused(withoutCredentials(reason));
  }

  /**
   * @param refusals gets a reason for each point that was refused for good
   * @returns how many points were written
   */
  private async write(
    influx: InfluxDB,
    points: IPoint[],
    refusals: string[],
    mayCreate = true,
  ): Promise<number> {
    if (points.length === 0) return 0;
    try {
      await influx.writePoints(points, { precision: 'ms' });
      return points.length;
    } catch (thrown) {
      const status = statusOf(thrown);
      if (status === 404 && mayCreate) {
        await influx.createDatabase(this.options.config.database);
        return this.write(influx, points, refusals, false);
      }
      if (status !== 400 && status !== 413) throw thrown;
      return this.halve(influx, points, refusals, complaintOf(thrown));
    }
  }

  /** Finds the points that are refused by halving the batch, and leaves out those alone. */
  private async halve(
    influx: InfluxDB,
    points: IPoint[],
    refusals: string[],
    reason: string,
  ): Promise<number> {
    if (points.length === 1) {
      refusals.push(reason);
      return 0;
    }
    const middle = points.length >> 1;
    const first = await this.write(influx, points.slice(0, middle), refusals);
    return first + (await this.write(influx, points.slice(middle), refusals));
  }

  private succeeded(): void {
    this.hasWritten = true;
    this.retry_ms = RETRY_LEAST_MS;
    if (this.reason === null) return;
    this.reason = null;
    this.options.up();
  }

  private failed(reason: string): void {
    this.options.count('influx_failures', 1);
    const isNew = this.reason === null;
    this.reason = withoutCredentials(reason);
    if (isNew) this.options.down(this.reason);
  }
}

/** The client's own ping says only that there was no answer, not why. */
function ping(config: InfluxConfig): Promise<void> {
  const url = new URL('ping', config.url.replace(/\/?$/, '/'));
  const options = { timeout: REQUEST_TIMEOUT_MS, agent: false } as const;
  return new Promise((resolve, reject) => {
    const answered = (response: IncomingMessage) => {
      response.resume();
      const status = response.statusCode ?? 0;
      if (status < 300) resolve();
      else reject(new Error(`a ping was answered with ${status}`));
    };
    const asked =
      url.protocol === 'https:'
        ? askSecurely(url, { ...options, ...clientTlsOptions(config.tls) }, answered)
        : ask(url, options, answered);
    asked.on('timeout', () => asked.destroy(new Error('no answer to a ping')));
    asked.on('error', reject);
    asked.end();
  });
}

function makeClient(config: InfluxConfig): InfluxDB {
  const url = new URL(config.url);
  const isSecure = url.protocol === 'https:';
  const pool: IPoolOptions = {
    maxRetries: 0,
    requestTimeout: REQUEST_TIMEOUT_MS,
    backoff: NO_BACKOFF,
  };
  return new InfluxDB({
    database: config.database,
    hosts: [
      {
        host: url.hostname,
        port: Number(url.port || (isSecure ? 443 : 80)),
        protocol: isSecure ? 'https' : 'http',
        ...(isSecure ? { options: clientTlsOptions(config.tls) } : {}),
        ...(url.pathname === '/' ? {} : { path: url.pathname }),
      },
    ],
    ...(config.username === null ? {} : { username: config.username }),
    ...(config.password === null ? {} : { password: config.password }),
    pool,
  });
}

/** What InfluxDB said, in one line: its client puts a status line before the JSON of the answer. */
function complaintOf(thrown: unknown): string {
  const reason = reasonOf(thrown).trim().replace(/\s+/g, ' ');
  const status = statusOf(thrown);
  if (status === null) return reason;
  const words = /\{"error":"(.*)"\}$/.exec(reason)?.[1] ?? reason;
  return status === 401 || status === 403
    ? `it refuses the login of influx.username and its password (${status}: ${words})`
    : `it answers ${status}: ${words}`;
}

/** The HTTP status in an error of the client, which is circular: nothing else of it is touched. */
function statusOf(thrown: unknown): number | null {
  const { res } = thrown as { res?: { statusCode?: number } };
  return res?.statusCode ?? null;
}
