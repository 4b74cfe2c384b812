import { setImmediate as nextTurn } from 'node:timers/promises';
import { ownBytes, packetBytes } from './messageQueue.js';
import { matches } from './topicRules.js';

/** A message that is kept for whoever subscribes later. */
export interface RetainedMessage {
  readonly cmd: 'publish';
  readonly topic: string;
  readonly payload: Buffer;
  readonly qos: number;
  readonly retain: true;
}

/** Topics looked at for a filter before others have their turn. */
const AT_A_TIME = 500;

/** The newest message of each topic that was to be kept; those of others than rockhour are bounded. */
export class Retained {
  private readonly messages = new Map<string, { message: RetainedMessage; isOwn: boolean }>();
  private othersBytes = 0;

  constructor(private readonly most_bytes: number) {}

  get size(): number {
    return this.messages.size;
  }

  get bytes(): number {
    return this.othersBytes;
  }

  /**
   * Keeps a message, or ends the keeping of its topic where it is empty.
   * @returns false where there is no room for it: what was kept of the topic before stays
   */
  keep(topic: string, payload: Buffer | string, qos: number, isOwn: boolean): boolean {
    const before = this.messages.get(topic);
    const freed = before && !before.isOwn ? packetBytes(before.message) : 0;
    if (payload.length === 0) {
      this.messages.delete(topic);
      this.othersBytes -= freed;
      return true;
    }
    const message = {
      cmd: 'publish',
      topic,
      qos,
      retain: true,
      payload: ownBytes(payload),
    } as const;
    const grown = (isOwn ? 0 : packetBytes(message)) - freed;
    if (!isOwn && this.othersBytes + grown > this.most_bytes) return false;
    this.messages.set(topic, { message, isOwn });
    this.othersBytes += grown;
    return true;
  }

  /** What filters ask for, one filter after the other. A topic by its name is found at once. */
  async *of(filters: readonly string[]): AsyncGenerator<RetainedMessage> {
    let looked = 0;
    for (const filter of filters) {
      if (!/[+#]/.test(filter)) {
        const found = this.messages.get(filter);
        if (found) yield found.message;
        continue;
      }
      for (const [topic, { message }] of this.messages) {
        if (++looked % AT_A_TIME === 0) await nextTurn();
        if (matches(filter, topic)) yield message;
      }
    }
  }
}
