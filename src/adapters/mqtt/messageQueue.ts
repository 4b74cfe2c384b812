/** A message, or the word that one was released, that waits for one client of its own broker. */
export interface WaitingPacket {
  readonly cmd: string;
  readonly brokerId?: string;
  readonly brokerCounter?: number;
  readonly topic?: string;
  readonly payload?: Buffer | string;
  readonly qos?: number;
  readonly retain?: boolean;
  readonly dup?: boolean;
  messageId?: number | undefined;
}

/** What an object and its places in maps take beside topic and payload [bytes]. */
const OBJECT_BYTES = 400;

export const packetBytes = ({ topic = '', payload = '' }: WaitingPacket): number =>
  OBJECT_BYTES + 2 * topic.length + payload.length;

/**
 * Bytes of their own: a part of what came in one piece from the network would hold all of that piece,
 * and out of Node's pool a part of others' pieces.
 */
export function ownBytes(bytes: Buffer | string): Buffer {
  if (typeof bytes === 'string') return Buffer.from(bytes);
  const copy = Buffer.allocUnsafeSlow(bytes.length);
  bytes.copy(copy);
  return copy;
}

/**
 * Messages that one client has not acknowledged, in their order. Each is found by the broker's number
 * and, once it has been sent, by its packet identifier, in a time that does not grow with the queue.
 */
export class MessageQueue {
  private readonly packets = new Map<number, WaitingPacket>();
  /** Numbers by packet identifier; several where more than 65,535 are on their way. */
  private readonly sent = new Map<number, number | number[]>();
  bytes = 0;

  get size(): number {
    return this.packets.size;
  }

  has(no: number): boolean {
    return this.packets.has(no);
  }

  add(no: number, packet: WaitingPacket): void {
    this.packets.set(no, packet);
    this.bytes += packetBytes(packet);
  }

  /** The message has been sent under a packet identifier. @returns false where there is no such */
  name(no: number, messageId: number): boolean {
    const packet = this.packets.get(no);
    if (packet === undefined) return false;
    if (packet.messageId === messageId) return true;
    packet.messageId = messageId;
    const known = this.sent.get(messageId);
    if (known === undefined) this.sent.set(messageId, no);
    else this.sent.set(messageId, [...(typeof known === 'number' ? [known] : known), no]);
    return true;
  }

  /** Puts another in the place of the one sent first under its identifier. */
  replace(packet: WaitingPacket): boolean {
    const no = this.firstOf(packet.messageId);
    const before = no === undefined ? undefined : this.packets.get(no);
    if (no === undefined || before === undefined) return false;
    this.packets.set(no, packet);
    this.bytes += packetBytes(packet) - packetBytes(before);
    return true;
  }

  /** Takes out what was sent first under this identifier. */
  acknowledged(messageId: number | undefined): WaitingPacket | undefined {
    const no = this.firstOf(messageId);
    if (no === undefined || messageId === undefined) return undefined;
    const known = this.sent.get(messageId);
    if (typeof known === 'object' && known.length > 1) this.sent.set(messageId, known.slice(1));
    else this.sent.delete(messageId);
    return this.take(no);
  }

  /** Takes out one that is not to be sent. */
  drop(no: number): void {
    const messageId = this.packets.get(no)?.messageId;
    if (messageId === undefined) this.take(no);
  }

  all(): WaitingPacket[] {
    return [...this.packets.values()];
  }

  private take(no: number): WaitingPacket | undefined {
    const packet = this.packets.get(no);
    if (packet === undefined) return undefined;
    this.packets.delete(no);
    this.bytes -= packetBytes(packet);
    return packet;
  }

  private firstOf(messageId: number | undefined): number | undefined {
    const known = messageId === undefined ? undefined : this.sent.get(messageId);
    return typeof known === 'object' ? known[0] : known;
  }
}
