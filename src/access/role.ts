/**
 * What a token may do. `view`, `acknowledge` and `configure` contain each other in this order;
 * `feed` stands apart: a gateway of the plant publishes readings and sees nothing.
 */
export const ROLES = ['view', 'acknowledge', 'configure', 'feed'] as const;
export type Role = (typeof ROLES)[number];

/** Roles of people and their programs, the least first. */
export const RANKS = ['view', 'acknowledge', 'configure'] as const;
export type Rank = (typeof RANKS)[number];

/** Whether whoever has this role may do what is asked of that one. */
export function covers(has: Role, needed: Role): boolean {
  if (has === 'feed' || needed === 'feed') return has === needed;
  return RANKS.indexOf(has) >= RANKS.indexOf(needed);
}
