import { Access } from '../../src/access/access.js';
import { ROLES, type Role } from '../../src/access/role.js';
import { type AccessToken, hashOf, makeToken } from '../../src/access/token.js';

/** One token of each role, named `a_ROLE`, and who is let in by them. */
export function holders() {
  const tokens = Object.fromEntries(ROLES.map((role) => [role, makeToken()])) as Record<
    Role,
    string
  >;
  const list = ROLES.map((role): AccessToken => {
    return { name: `a_${role}`, role, hash: hashOf(tokens[role]) };
  });
  return { access: new Access(list), tokens, list };
}
