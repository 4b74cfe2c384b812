import type { WebhookConfig } from '../../config/site.js';
import type { ToldEvent } from '../../core/alarm/telling.js';
import { reasonOf } from '../../errors.js';
import { post } from './post.js';
import { type EventQueue, QueueLoop } from './queueLoop.js';
import { signedHeaders } from './signature.js';

export const WEBHOOK_COUNTS = [
  'webhook_sent',
  'webhook_failures',
  /** Older than `oldest_h` before it could be delivered: left out. */
  'webhook_expired',
  /** Refused for good by the receiver: left out, so that the rest can go on. */
  'webhook_set_aside',
] as const;
export type WebhookCount = (typeof WEBHOOK_COUNTS)[number];

export interface WebhookOptions {
  readonly config: WebhookConfig;
  readonly site: string;
  readonly queue: EventQueue;
  /** Wall clock [ms since 1970]. */
  now(): number;
  count(name: WebhookCount, by: number): void;
  /** Cannot be delivered, and why: once per outage. */
  down(reason: string): void;
  up(): void;
  /** An event that the receiver refuses for good, and what it answered. */
  refused(reason: string): void;
  /** First pause after a failure [ms]; it doubles up to 5 min. Default 1000. */
  readonly retry_least_ms?: number;
}

const IDLE_MS = 1000;
const RETRY_LEAST_MS = 1000;
const RETRY_MOST_MS = 300_000;
/** Says that the message itself is not accepted: sending it again would change nothing. */
const REFUSED = new Set([400, 406, 409, 410, 413, 415, 422]);
const RANK = { high: 0, medium: 1, low: 2 } as const;

/**
 * Posts what is told of alarms and alerts to one receiver, behind a cursor on disk: a receiver that is
 * away gets all that happened meanwhile, up to `oldest_h`, and knows what it has by `webhook-id`. Any 2xx
 * is delivered. What the receiver refuses as such is set aside; all else (no connection, no answer in
 * time, a redirect, 401, 404, 429, 5xx) is tried again with growing pauses.
 */
export class WebhookForwarder {
  private readonly loop: QueueLoop;
  private underWay: AbortController | null = null;
  private retry_ms: number;
  private reason: string | null = null;

  constructor(private readonly options: WebhookOptions) {
    this.retry_ms = options.retry_least_ms ?? RETRY_LEAST_MS;
    this.loop = new QueueLoop({
      queue: options.queue,
      idle_ms: IDLE_MS,
      deliver: ({ seq, event }) => this.forward(seq, event),
      failed: (thrown) => {
        this.failed(reasonOf(thrown));
        const pause_ms = this.retry_ms;
        this.retry_ms = Math.min(RETRY_MOST_MS, this.retry_ms * 2);
        return pause_ms;
      },
    });
  }

  /** Why nothing can be delivered now, null while all is well. */
  get trouble(): string | null {
    return this.reason;
  }

  start(): void {
    this.loop.start();
  }

  /** Cuts a request under way short: it will be repeated. */
  async stop(): Promise<void> {
    const over = this.loop.stop();
    this.underWay?.abort();
    await over;
  }

  private async forward(seq: number, event: ToldEvent): Promise<void> {
    const { config, count, now } = this.options;
    if (!this.isWanted(event)) return;
    if (now() - Date.parse(event.time) > config.oldest_h * 3_600_000) count('webhook_expired', 1);
    else await this.deliver(seq, event);
  }

  private isWanted(event: ToldEvent): boolean {
    const { config } = this.options;
    if (!config.send.includes(event.class)) return false;
    return RANK[event.priority] <= RANK[config.least_priority];
  }

  private async deliver(seq: number, event: ToldEvent): Promise<void> {
    const { config, site, count, now, refused } = this.options;
    const body = JSON.stringify({
      type: `${event.class}.${event.transition}`,
      timestamp: event.time,
      data: { site, ...event },
    });
    const id = `rockhour_${seq}_${Date.parse(event.time)}`;
    const answer = await this.post(body, {
      'content-type': 'application/json; charset=utf-8',
      ...signedHeaders(config.secret, id, now() / 1000, body),
    });
    if (answer >= 200 && answer < 300) {
      count('webhook_sent', 1);
      this.succeeded();
    } else if (REFUSED.has(answer)) {
      count('webhook_set_aside', 1);
      refused(`${event.id} ${event.transition}: it answers ${answer}`);
      this.succeeded();
    } else throw new Error(`it answers ${answer}`);
  }

  /** @returns the status of the answer; its body is not read */
  private async post(body: string, headers: Record<string, string>): Promise<number> {
    const { config } = this.options;
    const cut = new AbortController();
    this.underWay = cut;
    const late = setTimeout(
      () => cut.abort(new Error(`no answer within ${config.timeout_s} s`)),
      1000 * config.timeout_s,
    );
    try {
      const { url, tls = null } = config;
      return await post({ url, headers, body, tls, signal: cut.signal });
    } catch (thrown) {
      throw inWords(thrown);
    } finally {
      clearTimeout(late);
      this.underWay = null;
    }
  }

  private succeeded(): void {
    this.retry_ms = this.options.retry_least_ms ?? RETRY_LEAST_MS;
    if (this.reason === null) return;
    this.reason = null;
    this.options.up();
  }

  private failed(reason: string): void {
    this.options.count('webhook_failures', 1);
    const isNew = this.reason === null;
    this.reason = reason;
    if (isNew) this.options.down(reason);
  }
}

/** OpenSSL tells of the lines of its own source; what matters is that nobody spoke TLS there. */
function inWords(thrown: unknown): unknown {
  const words = reasonOf(thrown);
  if (!/SSL routines/.test(words)) return thrown;
  const what = /wrong version number|packet length too long|http request/.test(words)
    ? 'it answers without TLS: is it http, or another port?'
    : (/SSL routines:[^:]*:([^:]*)/.exec(words)?.[1] ?? 'failed');
  return new Error(`TLS: ${what}`);
}
