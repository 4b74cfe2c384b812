import type { ToldEvent } from '../../core/alarm/telling.js';

/** What is told, in the order in which it was made, and how far the broker has them; kept on disk. */
export interface ToldEvents {
  read(most: number): readonly { readonly seq: number; readonly event: ToldEvent }[];
  moveTo(seq: number): void;
}

export interface EventTellerOptions {
  readonly prefix: string;
  readonly queue: ToldEvents;
  /** Resolves once the broker has it, else throws. */
  deliver(topic: string, payload: string): Promise<void>;
  count(name: 'events_told' | 'events_told_failures'): void;
}

const IDLE_MS = 500;
const RETRY_MS = 2000;
const ITEMS = 50;

/**
 * Tells what becomes of alarms and alerts, each as a message of its own on `PREFIX/UNIT/event` (QoS 1, not retained), one
 * by one in order, at least once, behind a cursor on disk: a broker that was away gets what happened
 * meanwhile. Whoever wants only what stands now reads the retained list.
 */
export class EventTeller {
  private timer: NodeJS.Timeout | null = null;
  private round: Promise<void> = Promise.resolve();
  private running = false;

  constructor(private readonly options: EventTellerOptions) {}

  start(): void {
    if (this.running) return;
    this.running = true;
    this.schedule(0);
  }

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
    const { queue, deliver, prefix, count } = this.options;
    try {
      const page = queue.read(ITEMS);
      for (const { seq, event } of page) {
        if (!this.running) return;
        await deliver(`${prefix}/${event.unit}/event`, JSON.stringify(event));
        count('events_told');
        // Stopped meanwhile, the queue may be closed: the event is told again after the next start.
        if (!this.running) return;
        queue.moveTo(seq);
      }
      this.schedule(page.length === ITEMS ? 0 : IDLE_MS);
    } catch {
      // The link itself says why the broker is away.
      count('events_told_failures');
      this.schedule(RETRY_MS);
    }
  }
}
