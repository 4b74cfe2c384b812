/** Where a client's messages go. */
export interface StreamSink {
  /** Resolves once more may be written, and when the client has gone. */
  write(text: string): Promise<void>;
  /** Ends it, without waiting for what the client has not taken. */
  destroy(): void;
  end(): void;
  onClose(callback: () => void): void;
}

/**
 * The messages that wait for one client. A message with the key of a waiting one takes its place,
 * so that states and beats never pile up; events have keys of their own. A client that lets more
 * than `most` wait is cut off: it comes back with its last id and is given what it missed.
 */
export class StreamClient {
  private readonly waiting = new Map<string, string>();
  private writing = false;
  private stuckSince_ms: number | null = null;
  private closed = false;

  constructor(
    private readonly sink: StreamSink,
    /** Unit whose profile this client wants along with the states. */
    readonly profileOf: string | null,
    private readonly most: number,
    private readonly onSlow: () => void,
  ) {
    sink.onClose(() => {
      this.closed = true;
      this.waiting.clear();
    });
  }

  push(key: string, text: string): void {
    if (this.closed) return;
    this.waiting.set(key, text);
    if (!this.writing) void this.drain();
    else if (this.waiting.size > this.most) this.cutOff();
  }

  end(): void {
    this.closed = true;
    this.waiting.clear();
    this.sink.end();
  }

  /** Cuts off a client that has taken nothing for `limit_ms`. */
  endIfStuck(limit_ms: number): void {
    if (this.stuckSince_ms !== null && performance.now() - this.stuckSince_ms > limit_ms) {
      this.cutOff();
    }
  }

  private cutOff(): void {
    if (this.closed) return;
    this.closed = true;
    this.waiting.clear();
    this.onSlow();
    this.sink.destroy();
  }

  private async drain(): Promise<void> {
    this.writing = true;
    try {
      while (!this.closed) {
        const next = this.waiting.entries().next();
        if (next.done) break;
        const [key, text] = next.value;
        this.waiting.delete(key);
        this.stuckSince_ms = performance.now();
        await this.sink.write(text);
        this.stuckSince_ms = null;
      }
    } finally {
      this.writing = false;
    }
  }
}
