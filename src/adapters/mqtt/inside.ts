import { Duplex } from 'node:stream';

/** One end of a connection within the process. */
class End extends Duplex {
  other: End | null = null;
  /** Ends the other's write, once what it wrote is wanted. */
  private taken: (() => void) | null = null;

  override _read(): void {
    const { taken } = this;
    this.taken = null;
    taken?.();
  }

  override _write(chunk: Buffer, _encoding: BufferEncoding, done: (error?: Error) => void): void {
    const { other } = this;
    if (other === null || other.destroyed || chunk.length === 0) {
      process.nextTick(done);
      return;
    }
    other.taken = done;
    other.push(chunk);
  }

  override _final(done: () => void): void {
    if (this.other !== null && !this.other.destroyed) this.other.push(null);
    done();
  }

  override _destroy(error: Error | null, done: (error: Error | null) => void): void {
    const { other, taken } = this;
    this.taken = null;
    taken?.();
    // A socket that is gone is gone for both.
    if (other !== null) process.nextTick(() => other.destroy());
    done(error);
  }
}

/**
 * The two ends of a connection that crosses no network: rockhour's own way to its own broker, which
 * needs no certificate and cannot be kept out by others that take all places.
 */
export function connectedPair(): readonly [Duplex, Duplex] {
  const [one, other] = [new End(), new End()];
  one.other = other;
  other.other = one;
  return [one, other];
}
