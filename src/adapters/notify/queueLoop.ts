import type { ToldEvent } from '../../core/alarm/telling.js';

export interface QueuedEvent {
  readonly seq: number;
  readonly event: ToldEvent;
}

/** What is told, in the order in which it was made, and how far a receiver has it; kept on disk. */
export interface EventQueue {
  /** Events behind the cursor, oldest first, at most `most`. */
  read(most: number): readonly QueuedEvent[];
  moveTo(seq: number): void;
}

export interface QueueLoopOptions {
  readonly queue: EventQueue;
  /** Pause before the queue is looked at again once it was empty [ms]. */
  readonly idle_ms: number;
  /** Resolves once the receiver has the event or shall never have it; throws to have it tried again. */
  deliver(queued: QueuedEvent): Promise<void>;
  /** Not while stopping. @returns the pause before the next try [ms] */
  failed(thrown: unknown): number;
}

const ITEMS = 50;

/**
 * Takes a queue on disk to a receiver, one event by one in order, at least once: the cursor moves when
 * an event is delivered, so one that was under way at a stop is delivered again. It runs on its own
 * timer: nothing else waits for it.
 */
export class QueueLoop {
  private timer: NodeJS.Timeout | null = null;
  private round: Promise<void> = Promise.resolve();
  private running = false;

  constructor(private readonly options: QueueLoopOptions) {}

  start(): void {
    if (this.running) return;
    this.running = true;
    this.schedule(0);
  }

  /** Resolves once nothing is under way; the queue may be closed then. */
  async stop(): Promise<void> {
    this.running = false;
    if (this.timer) clearTimeout(this.timer);
    this.timer = null;
    await this.round;
  }

  private schedule(delay_ms: number): void {
    if (!this.running) return;
    this.timer = setTimeout(() => {
      this.round = this.run();
    }, delay_ms);
  }

  private async run(): Promise<void> {
    const { idle_ms, failed } = this.options;
    try {
      const more = await this.page();
      this.schedule(more ? 0 : idle_ms);
    } catch (thrown) {
      if (this.running) this.schedule(failed(thrown));
    }
  }

  /** One page of the queue; true where more may wait. */
  private async page(): Promise<boolean> {
    const { queue, deliver } = this.options;
    const page = queue.read(ITEMS);
    for (const queued of page) {
      if (!this.running) return false;
      await deliver(queued);
      // Stopped meanwhile, the queue may be closed: the event is delivered again after the next start.
      if (!this.running) return false;
      queue.moveTo(queued.seq);
    }
    return page.length === ITEMS;
  }
}
