import { timingSafeEqual } from 'node:crypto';
import type { Role } from './role.js';
import { type AccessToken, digestOf } from './token.js';

/** Whoever showed a token: known by its name, which is recorded with what is done. */
export interface Holder {
  readonly name: string;
  readonly role: Role;
}

interface Known extends Holder {
  readonly digest: Buffer;
  readonly hash: string;
}

/** A token is 52 characters; what is longer is not even hashed. */
const LONGEST = 256;

/**
 * Who may come in. Of each token only the hash is known; a token shown is compared with all of
 * them, each in constant time, so that an answer's time tells nothing. Without tokens all is open.
 */
export class Access {
  private known: readonly Known[] = [];
  private readonly listeners = new Set<() => void>();

  constructor(tokens: readonly AccessToken[] = []) {
    this.known = tokens.map(take);
  }

  /** No token is configured: nobody is asked who they are. */
  get isOpen(): boolean {
    return this.known.length === 0;
  }

  /** Whose token this is, null where it is nobody's. */
  holderOf(token: string): Holder | null {
    if (token.length > LONGEST) return null;
    const digest = digestOf(token);
    let found: Known | null = null;
    for (const one of this.known) if (timingSafeEqual(one.digest, digest)) found = one;
    return found;
  }

  /** Whether this one is still let in, with the same role. */
  stillHolds(holder: Holder): boolean {
    return this.known.some((one) => one === holder);
  }

  /** Takes other tokens in the place of those before; what is the same stays as it is. */
  replace(tokens: readonly AccessToken[]): void {
    const { known } = this;
    this.known = tokens.map((token) => known.find((one) => isSame(one, token)) ?? take(token));
    for (const listener of this.listeners) listener();
  }

  /** Is told whenever the tokens are others. Returns what ends that. */
  onChange(listener: () => void): () => void {
    this.listeners.add(listener);
    return () => this.listeners.delete(listener);
  }
}

function take({ name, role, hash }: AccessToken): Known {
  return { name, role, hash, digest: Buffer.from(hash.replace(/^sha256:/, ''), 'hex') };
}

const isSame = (one: Known, token: AccessToken) =>
  one.name === token.name && one.role === token.role && one.hash === token.hash;
