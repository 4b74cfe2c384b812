/** MQTT 3.1.1, 2.2.3: the remaining length has at most four bytes of seven bits each. */
const MOST_LENGTH_BYTES = 4;

/**
 * Follows where packets begin in the bytes of one connection, without keeping any, and tells one that
 * is too great as soon as its length is known: whoever collects packets has not got it then.
 */
export class PacketSizes {
  /** Bytes of the present packet that are still to come. */
  private left = 0;
  private isInLength = false;
  private length = 0;
  private shift = 0;
  /** Packets that have begun. */
  begun = 0;

  /** A packet has begun whose end has not come. */
  get isWithin(): boolean {
    return this.isInLength || this.left > 0;
  }

  /**
   * @param most greatest packet, with its header [bytes]
   * @returns the size of the first packet that is greater; 0: there is none
   */
  see(bytes: Uint8Array, most: number): number {
    let at = 0;
    while (at < bytes.length) {
      if (this.left > 0) {
        const step = Math.min(this.left, bytes.length - at);
        this.left -= step;
        at += step;
        continue;
      }
      const byte = bytes[at++]!;
      if (!this.isInLength) {
        // The first byte says what it is; the length follows.
        [this.isInLength, this.length, this.shift] = [true, 0, 0];
        this.begun++;
        continue;
      }
      this.length += (byte & 0x7f) * 2 ** (7 * this.shift++);
      if ((byte & 0x80) !== 0 && this.shift < MOST_LENGTH_BYTES) continue;
      const size = 1 + this.shift + this.length;
      if (size > most) return size;
      this.isInLength = false;
      this.left = this.length;
    }
    return 0;
  }
}
