import type { Beat, Hello, StreamState } from './wire.js';

export interface LiveHandlers {
  /** Opened, with the server's greeting. */
  hello(hello: Hello): void;
  state(state: StreamState): void;
  /**
   * An alarm or alert was raised, returned or acknowledged.
   * @param leftOut how many events of a storm were not sent one by one
   */
  alarms(leftOut: number): void;
  beat(beat: Beat): void;
  lost(): void;
}

const FIRST_RETRY_MS = 1_000;
const LONGEST_RETRY_MS = 10_000;

/**
 * The one stream of the page. The browser's own reconnecting is not enough: it gives up for good
 * on a proxy's 502, and it does not notice a connection that is open and silent. So every loss is
 * handled alike here: close, say so, try again after 1, 2, 4, 8, 10 s with the last event's id;
 * and silence of two and a half heartbeats counts as a loss.
 */
export class LiveConnection {
  private source: EventSource | null = null;
  private lastEventId: string | null = null;
  private lastHeard_ms = 0;
  private heartbeat_ms = 5_000;
  private retry_ms = FIRST_RETRY_MS;
  private retryTimer: number | undefined;
  private profileOf: string | null = null;

  constructor(
    private readonly urlOf: (profileOf: string | null, lastEventId: string | null) => string,
    private readonly handlers: LiveHandlers,
  ) {
    window.setInterval(() => this.watch(), 500);
    // Coming back to the page or the network: do not wait for the timer.
    window.addEventListener('online', () => this.retryNow());
    document.addEventListener('visibilitychange', () => this.retryNow());
  }

  /** (Re)opens the stream so that it carries the profile of this unit. */
  follow(profileOf: string): void {
    this.profileOf = profileOf;
    this.open();
  }

  /** Ends the stream until it is followed again. */
  stop(): void {
    window.clearTimeout(this.retryTimer);
    this.retryTimer = undefined;
    this.source?.close();
    this.source = null;
  }

  private open(): void {
    window.clearTimeout(this.retryTimer);
    this.retryTimer = undefined;
    this.source?.close();
    const source = new EventSource(this.urlOf(this.profileOf, this.lastEventId));
    this.source = source;
    this.lastHeard_ms = performance.now();
    const on = (name: string, take: (data: never) => void) =>
      source.addEventListener(name, (event: MessageEvent<string>) => {
        if (source !== this.source) return;
        this.lastHeard_ms = performance.now();
        if (event.lastEventId !== '') this.lastEventId = event.lastEventId;
        take(JSON.parse(event.data) as never);
      });
    on('hello', (hello: Hello) => {
      this.heartbeat_ms = hello.heartbeat_ms;
      this.retry_ms = FIRST_RETRY_MS;
      this.handlers.hello(hello);
    });
    on('state', (state: StreamState) => this.handlers.state(state));
    on('event', () => this.handlers.alarms(0));
    on('alarms', (news: { left_out?: number }) => this.handlers.alarms(news.left_out ?? 0));
    on('beat', (beat: Beat) => this.handlers.beat(beat));
    source.onerror = () => {
      if (source === this.source) this.lose();
    };
  }

  private lose(): void {
    this.source?.close();
    this.source = null;
    this.handlers.lost();
    this.retryTimer = window.setTimeout(() => this.open(), this.retry_ms);
    this.retry_ms = Math.min(2 * this.retry_ms, LONGEST_RETRY_MS);
  }

  private watch(): void {
    if (this.source === null) return;
    if (performance.now() - this.lastHeard_ms > 2.5 * this.heartbeat_ms) this.lose();
  }

  private retryNow(): void {
    if (this.retryTimer !== undefined && document.visibilityState === 'visible') this.open();
  }
}
