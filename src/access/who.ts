import type { Holder } from './access.js';

/**
 * Who is recorded for what the holder of a token does: the token's name, which cannot be chosen,
 * and behind it in brackets the name that was given, where it is another. So several people may
 * share the token of a control room, and nobody can sign as somebody else.
 *
 *     control_room            nothing given, or the same
 *     control_room (Ada)      `Ada` given
 */
export function recordedWho(holder: Holder, given: unknown): unknown {
  if (given === undefined || given === null) return holder.name;
  // What is no text is refused further on, as without tokens.
  if (typeof given !== 'string') return given;
  const said = given.trim();
  return said === '' || said === holder.name ? holder.name : `${holder.name} (${said})`;
}
