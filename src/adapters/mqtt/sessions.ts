import { MessageQueue, ownBytes, packetBytes, type WaitingPacket } from './messageQueue.js';

export interface SessionBounds {
  /** Sessions of others than rockhour. */
  readonly sessions_most: number;
  /** What may wait for all of them together, and for rockhour's own [bytes]. */
  readonly queued_most_bytes: number;
  readonly own_queued_most_bytes: number;
}

/** Of what may wait for others one session has at most this share. */
const SESSION_SHARE = 0.25;
/** A session absent for so long gives way to a new one where there are too many [ms]. */
const GIVES_WAY_MS = 3_600_000;
/** One absent for so long is given up: rockhour asks no more of a broker for itself [ms]. */
const EXPIRES_MS = 7 * 86_400_000;

interface Session {
  readonly queue: MessageQueue;
  /** Packet identifiers of QoS 2 that came in and were not released. */
  readonly incoming: Set<number>;
  readonly isOwn: boolean;
  /** It outlives the connection. */
  readonly isKept: boolean;
  /** null: it is connected [ms]. */
  absentSince: number | null;
}

/**
 * What its own broker keeps for each client that asked for a session: what waits for it, and which
 * messages of QoS 2 it is handing in. All of it is bounded but nothing of rockhour's own is refused:
 * where too much waits for rockhour, publishers wait (`hasRoom`).
 */
export class Sessions {
  private readonly sessions = new Map<string, Session>();
  /** Waits for others, and for rockhour's own links [bytes]. */
  private othersBytes = 0;
  private ownBytes = 0;
  private others = 0;

  constructor(
    private readonly bounds: SessionBounds,
    /** A session is given up. */
    private readonly dropped: (id: string) => void,
    private readonly now: () => number = () => performance.now(),
  ) {}

  get count(): number {
    return this.sessions.size;
  }

  get queuedBytes(): number {
    return this.othersBytes + this.ownBytes;
  }

  /** Whether one more message can wait for rockhour. */
  get hasRoom(): boolean {
    return this.ownBytes < this.bounds.own_queued_most_bytes;
  }

  /**
   * Takes a client in. One that asks for no session loses what it had.
   * @returns false where there are too many
   */
  enter(id: string, isKept: boolean, isOwn: boolean): boolean {
    const known = this.sessions.get(id);
    if (known?.isKept && isKept) {
      known.absentSince = null;
      return true;
    }
    this.forget(id);
    const isCounted = isKept && !isOwn;
    if (isCounted && this.others >= this.bounds.sessions_most && !this.giveUp(GIVES_WAY_MS, 1)) {
      return false;
    }
    const session = { queue: new MessageQueue(), incoming: new Set<number>() };
    this.sessions.set(id, { ...session, isOwn, isKept, absentSince: null });
    if (isCounted) this.others++;
    return true;
  }

  /** @param hasMore it has subscriptions that are to be kept */
  leave(id: string, hasMore: boolean): void {
    const session = this.sessions.get(id);
    if (session === undefined) return;
    session.absentSince = this.now();
    const isEmpty = !hasMore && session.queue.size === 0 && session.incoming.size === 0;
    if (isEmpty || !session.isKept) this.forget(id);
  }

  forget(id: string): void {
    const session = this.sessions.get(id);
    if (session === undefined) return;
    this.sessions.delete(id);
    if (session.isKept && !session.isOwn) this.others--;
    this.grow(session, -session.queue.bytes);
  }

  /** Gives up those that nobody has come back to. */
  expire(): void {
    this.giveUp(EXPIRES_MS, Number.POSITIVE_INFINITY);
  }

  /** @returns false where too much waits already: the message is not kept for this client */
  add(id: string, packet: WaitingPacket): boolean {
    const session = this.sessions.get(id);
    const no = packet.brokerCounter;
    if (session === undefined || no === undefined || session.queue.has(no)) return true;
    const { queue, isOwn } = session;
    const bytes = packetBytes(packet);
    const { queued_most_bytes: most } = this.bounds;
    const isTooMuch = this.othersBytes + bytes > most || queue.bytes + bytes > SESSION_SHARE * most;
    if (!isOwn && isTooMuch) return false;
    const { cmd, brokerId, topic, payload, qos, retain, dup } = packet;
    queue.add(no, {
      ...{ cmd, brokerId, brokerCounter: no, topic, qos, retain, dup },
      // What waits for rockhour is on its way.
      payload: isOwn ? payload : ownBytes(payload ?? ''),
    } as WaitingPacket);
    this.grow(session, bytes);
    return true;
  }

  /** The message has been sent, or has come to its next step. */
  update(id: string, packet: WaitingPacket): void {
    const session = this.sessions.get(id);
    if (session === undefined) return;
    const { brokerCounter: no, messageId } = packet;
    if (no !== undefined && messageId !== undefined && session.queue.name(no, messageId)) return;
    const { queue } = session;
    const before = queue.bytes;
    queue.replace(packet);
    this.grow(session, queue.bytes - before);
  }

  acknowledged(id: string, messageId: number | undefined): WaitingPacket | undefined {
    return this.change(id, (queue) => queue.acknowledged(messageId));
  }

  /** Takes out a message that this client may not have. */
  drop(id: string, no: number): void {
    this.change(id, (queue) => queue.drop(no));
  }

  waiting(id: string): WaitingPacket[] {
    return this.sessions.get(id)?.queue.all() ?? [];
  }

  incoming(id: string): Set<number> | undefined {
    return this.sessions.get(id)?.incoming;
  }

  private change<T>(id: string, act: (queue: MessageQueue) => T): T | undefined {
    const session = this.sessions.get(id);
    if (session === undefined) return undefined;
    const before = session.queue.bytes;
    const done = act(session.queue);
    this.grow(session, session.queue.bytes - before);
    return done;
  }

  private grow({ isOwn }: Session, bytes: number): void {
    if (isOwn) this.ownBytes += bytes;
    else this.othersBytes += bytes;
  }

  /** Gives up sessions absent for longer, the longest absent first. @returns whether there was one */
  private giveUp(longer_ms: number, most: number): boolean {
    const before = this.now() - longer_ms;
    const absent = [...this.sessions].filter(
      ([, { absentSince, isOwn }]) => !isOwn && absentSince !== null && absentSince <= before,
    );
    absent.sort(([, a], [, b]) => (a.absentSince ?? 0) - (b.absentSince ?? 0));
    for (const [id] of absent.slice(0, most)) {
      this.forget(id);
      this.dropped(id);
    }
    return absent.length > 0;
  }
}
