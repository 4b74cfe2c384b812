import { ROLES, type Role } from './role.js';
import { type AccessToken, HASH_PATTERN, NAME_PATTERN, repeatedToken } from './token.js';

/** One token per line; anything else than blanks and comments is a fault. */
export const LINE_WORDS = `lines NAME ROLE HASH, where ROLE is one of ${ROLES.join(', ')}`;
/** Longest file that is looked at [characters], and most tokens of a site. */
export const LONGEST_FILE = 100_000;
export const MOST_TOKENS = 200;

/**
 * A tokens file: `NAME ROLE HASH` on each line, separated by blanks; `#` begins a comment.
 * @returns the tokens, or what is wrong: the line is named, its content never, for a token may stand there
 */
export function readTokens(text: string): readonly AccessToken[] | { readonly fault: string } {
  if (text.length > LONGEST_FILE) return { fault: `more than ${LONGEST_FILE} characters` };
  const tokens: AccessToken[] = [];
  const lineOf: number[] = [];
  const lines = text.split(/\r?\n/);
  for (const [i, line] of lines.entries()) {
    const words = line.replace(/(^|\s)#.*/, '').trim();
    if (words === '') continue;
    const [name = '', role = '', hash = '', ...more] = words.split(/\s+/);
    const bad = !NAME_PATTERN.test(name)
      ? 'no name of a token at its beginning'
      : !ROLES.includes(role as Role)
        ? 'no known role in second place'
        : !HASH_PATTERN.test(hash)
          ? 'no hash in third place'
          : more.length > 0
            ? 'more than three words'
            : null;
    if (bad !== null) return { fault: `${bad} in line ${i + 1}` };
    tokens.push({ name, role: role as Role, hash });
    lineOf.push(i + 1);
  }
  if (tokens.length === 0) return { fault: 'no token' };
  if (tokens.length > MOST_TOKENS) return { fault: `more than ${MOST_TOKENS} tokens` };
  const twice = repeatedToken(tokens);
  if (twice === null) return tokens;
  return { fault: `a ${twice.what} that stands twice, again in line ${lineOf[twice.index]}` };
}
