import type { IncomingMessage, ServerResponse } from 'node:http';
import type { Socket } from 'node:net';

export interface UnreadBounds {
  /** Questions of one connection that are not answered to the end. */
  readonly waiting_each_most: number;
  /** Bytes of answers that clients have not taken, all together. */
  readonly unread_most_bytes: number;
  /** Nothing of an answer is taken for so long [ms]. */
  readonly unread_ms: number;
}

/** What a client has to take in that time to be one that reads [bytes]. */
const LEAST_BYTES = 4096;

interface Reader {
  readonly answers: Set<ServerResponse>;
  /** Bytes that it had taken then [ms]. */
  since_ms: number;
  taken: number;
}

/**
 * Answers that are not read. Node holds each until its client takes it, and answers all questions that
 * come in one piece at once, however many: whoever asks on without reading makes memory grow.
 */
export class Unread {
  private readonly readers = new Map<Socket, Reader>();
  /** Connections that were ended. */
  ended = 0;

  constructor(
    private readonly bounds: UnreadBounds,
    private readonly now: () => number = () => performance.now(),
  ) {}

  /** @returns false where the connection was ended: the question is not to be answered */
  take({ socket }: IncomingMessage, answer: ServerResponse): boolean {
    if (socket.destroyed) return false;
    const reader = this.readers.get(socket) ?? this.readerOf(socket);
    reader.answers.add(answer);
    answer.once('close', () => reader.answers.delete(answer));
    // All of it has been written, and may be much.
    answer.once('prefinish', () => this.makeRoom());
    if (reader.answers.size > this.bounds.waiting_each_most) this.end(socket);
    else this.makeRoom();
    return !socket.destroyed;
  }

  /** Ends who takes nothing of its answers. */
  look(): void {
    const now = this.now();
    for (const [socket, reader] of this.readers) {
      const taken = takenBy(socket);
      if (unreadOf(reader) === 0 || taken - reader.taken >= LEAST_BYTES) {
        Object.assign(reader, { since_ms: now, taken });
      } else if (now - reader.since_ms >= this.bounds.unread_ms) this.end(socket);
    }
    this.makeRoom();
  }

  /** Of too much that is not taken, who takes least gives way. */
  private makeRoom(): void {
    const all = [...this.readers].map(([socket, reader]) => ({ socket, bytes: unreadOf(reader) }));
    let sum = all.reduce((bytes, one) => bytes + one.bytes, 0);
    if (sum <= this.bounds.unread_most_bytes) return;
    for (const { socket, bytes } of all.sort((a, b) => b.bytes - a.bytes)) {
      if (sum <= this.bounds.unread_most_bytes) return;
      sum -= bytes;
      this.end(socket);
    }
  }

  private readerOf(socket: Socket): Reader {
    const reader = { answers: new Set<ServerResponse>(), since_ms: this.now(), taken: 0 };
    this.readers.set(socket, reader);
    socket.once('close', () => this.readers.delete(socket));
    return reader;
  }

  private end(socket: Socket): void {
    if (!this.readers.delete(socket)) return;
    this.ended += 1;
    socket.destroy();
  }
}

function unreadOf({ answers }: Reader): number {
  let bytes = 0;
  for (const answer of answers) bytes += answer.writableLength;
  return bytes;
}

const takenBy = (socket: Socket) => socket.bytesWritten - socket.writableLength;
