import { type EventQueue, QueueLoop } from './queueLoop.js';

export interface EventTellerOptions {
  readonly prefix: string;
  readonly queue: EventQueue;
  /** Resolves once the broker has it, else throws. */
  deliver(topic: string, payload: string): Promise<void>;
  count(name: 'events_told' | 'events_told_failures'): void;
}

const IDLE_MS = 500;
const RETRY_MS = 2000;

/**
 * Tells what becomes of alarms and alerts, each as a message of its own on `PREFIX/UNIT/event` (QoS 1,
 * not retained), behind a cursor on disk: a broker that was away gets what happened meanwhile. Whoever
 * wants only what stands now reads the retained list.
 */
export class EventTeller {
  private readonly loop: QueueLoop;

  constructor({ prefix, queue, deliver, count }: EventTellerOptions) {
    this.loop = new QueueLoop({
      queue,
      idle_ms: IDLE_MS,
      deliver: async ({ event }) => {
        await deliver(`${prefix}/${event.unit}/event`, JSON.stringify(event));
        count('events_told');
      },
      failed: () => {
        // The link itself says why the broker is away.
        count('events_told_failures');
        return RETRY_MS;
      },
    });
  }

  start(): void {
    this.loop.start();
  }

  stop(): Promise<void> {
    return this.loop.stop();
  }
}
