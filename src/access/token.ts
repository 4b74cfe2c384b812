import { createHash, randomBytes } from 'node:crypto';
import type { Role } from './role.js';

/** A token as the configuration knows it: what it is called, what it may do, what it hashes to. */
export interface AccessToken {
  readonly name: string;
  readonly role: Role;
  /** `sha256:` and 64 hexadecimal digits. */
  readonly hash: string;
}

/** 256 bits: nothing is gained by a slow hash, which is for words that people choose. */
const TOKEN_BYTES = 32;
const MARK = 'rockhour-';

/** A token wherever it stands in a text; the mark lets logs and scanners know one. */
export const TOKEN_PATTERN = /rockhour-[A-Za-z0-9_-]{43}/;
export const HASH_PATTERN = /^sha256:[0-9a-f]{64}$/;
/** Short enough that a person's own name fits beside it in what is recorded. */
export const NAME_PATTERN = /^[A-Za-z][A-Za-z0-9_.-]{0,31}$/;
export const NAME_WORDS =
  'a name that begins with a letter and holds at most 32 letters, digits, _ . -';
export const HASH_WORDS =
  'sha256: and 64 hexadecimal digits, as rockhour admit prints them; never the token itself';

/** A new token: the mark and 32 random bytes in base64url (RFC 4648, section 5). */
export function makeToken(random: (bytes: number) => Buffer = randomBytes): string {
  return MARK + random(TOKEN_BYTES).toString('base64url');
}

/** SHA-256 of the UTF-8 text. */
export const digestOf = (token: string): Buffer => createHash('sha256').update(token).digest();

/** What stands in the configuration for this token. */
export const hashOf = (token: string): string => `sha256:${digestOf(token).toString('hex')}`;

/** The first name or hash that stands twice, null where none does. */
export function repeatedToken(
  tokens: readonly AccessToken[],
): { readonly index: number; readonly what: 'name' | 'hash' } | null {
  for (let index = 0; index < tokens.length; index++) {
    for (const what of ['name', 'hash'] as const) {
      const earlier = tokens.slice(0, index).some((one) => one[what] === tokens[index]![what]);
      if (earlier) return { index, what };
    }
  }
  return null;
}
