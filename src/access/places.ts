import type { Socket } from 'node:net';
import { isIPv4 } from 'node:net';

/**
 * Whose an address is: itself by IPv4, the first 64 bits by IPv6, where a network has 2^64 to choose
 * from. An address of IPv4 in the form of IPv6 is one of IPv4.
 */
export function networkOf(address: string): string {
  const bare = address.replace(/^::ffff:(?=\d+\.)/i, '').replace(/%.*$/, '');
  if (isIPv4(bare) || !bare.includes(':')) return bare;
  const [before = '', after] = bare.toLowerCase().split('::');
  const groups = (text: string | undefined) => (text ? text.split(':') : []);
  const [left, right] = [groups(before), groups(after)];
  const zeros = after === undefined ? 0 : Math.max(0, 8 - left.length - right.length);
  const all = [...left, ...Array.from({ length: zeros }, () => '0'), ...right];
  const first = all.slice(0, 4).map((group) => Number.parseInt(group, 16).toString(16));
  return `${first.join(':')}::/64`;
}

/** Connections of each address: nobody takes all places of a server alone. */
export class Places {
  private readonly taken = new Map<string, number>();
  /** Connections that found no place. */
  refused = 0;

  /** @param mostEach connections of one address at the same time */
  constructor(private readonly mostEach: number) {}

  /** Keeps a place until the connection ends; ends it at once where its address has too many. */
  take(socket: Socket): boolean {
    const network = networkOf(socket.remoteAddress ?? '');
    const taken = this.taken.get(network) ?? 0;
    if (taken >= this.mostEach) {
      this.refused += 1;
      socket.destroy();
      return false;
    }
    this.taken.set(network, taken + 1);
    socket.once('close', () => {
      const left = (this.taken.get(network) ?? 1) - 1;
      if (left > 0) this.taken.set(network, left);
      else this.taken.delete(network);
    });
    return true;
  }
}
