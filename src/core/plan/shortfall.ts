import { RULES } from '../dispatch/rollout.js';
import type { EndCause } from '../estimate.js';
import type { Evaluation } from './evaluation.js';
import { NORMAL_COUNT } from './latinNormals.js';
import type { CommandCause } from './leg.js';
import type { RunEnergy } from './runEnergy.js';

/** Where a schedule first falls short. */
export interface FirstShort {
  readonly t_s: number;
  /** Of the run (or of the block, where the machine cannot be commanded) from then to its end. */
  readonly energy_J: number;
  readonly cause: EndCause | CommandCause;
}

/** Neighbours by time from which cause and size are taken, either side: 2.5 % of the points. */
const ASIDE = Math.round(NORMAL_COUNT / 40);

/**
 * The first shortfall at a certainty: with that probability nothing is short before. What machine,
 * connection and outages leave unmet is certain. A run is short from its first broken rule on, also
 * where it goes on at its greatest flow and gives less.
 *
 * Time: quantile of the first break of any run over the points of the joint distribution. Size and
 * cause: mean and most frequent of the points next to it.
 *
 * @returns null where nothing is short at that certainty
 */
export function firstShortfall(
  evaluation: Evaluation,
  energies: readonly RunEnergy[],
  certainty: number,
): FirstShort | null {
  const unmet = firstUnmet(evaluation);
  const stores = storesShortfall(evaluation, energies, certainty);
  if (unmet === null || stores === null) return unmet ?? stores;
  return stores.t_s < unmet.t_s ? stores : unmet;
}

function firstUnmet({ command }: Evaluation): FirstShort | null {
  const [first] = [...command.unmet].sort((a, b) => a.from_s - b.from_s);
  if (first === undefined) return null;
  const energy_J = command.unmet
    .filter(({ leg, cause }) => leg === first.leg && cause === first.cause)
    .reduce((sum, part) => sum + part.missing_W * (part.to_s - part.from_s), 0);
  return { t_s: first.from_s, energy_J, cause: first.cause };
}

/** The same of the stores alone: as if the machine were asked for no more than it can be told. */
export function storesShortfall(
  { course, first_s, rule }: Evaluation,
  energies: readonly RunEnergy[],
  certainty: number,
): FirstShort | null {
  const points = Array.from({ length: NORMAL_COUNT }, (_, k) => {
    // Runs follow each other in time, so the first that breaks is the earliest.
    const e = course.episodes.findIndex(
      (episode, i) => (first_s[i]?.[k] as number) < episode.held_s - 1e-6,
    );
    return { k, e, t_s: e < 0 ? Number.POSITIVE_INFINITY : (first_s[e]?.[k] as number) };
  }).sort((a, b) => (a.t_s === b.t_s ? a.k - b.k : a.t_s - b.t_s));
  const at = Math.min(NORMAL_COUNT - 1, Math.floor((1 - certainty) * NORMAL_COUNT));
  const own = points[at] as (typeof points)[number];
  if (own.e < 0) return null;
  const near = points.slice(Math.max(0, at - ASIDE), at + ASIDE + 1);
  const votes = new Map<number, number>();
  for (const { k, e } of near) {
    const which = rule[e]?.[k] ?? -1;
    if (e === own.e) votes.set(which, (votes.get(which) ?? 0) + 1);
  }
  const [most] = [...votes.entries()].sort((a, b) => b[1] - a[1]);
  const { from_s, held_s } = course.episodes[own.e] as Evaluation['course']['episodes'][number];
  const energy = energies[own.e] as RunEnergy;
  const same = near.filter(({ e }) => e === own.e);
  const missing = same.map(
    ({ k }) => energy.commanded(from_s, held_s) - energy.delivered(k, from_s, held_s),
  );
  const energy_J = missing.reduce((sum, value) => sum + value, 0) / missing.length;
  return { t_s: own.t_s, energy_J, cause: RULES[most?.[0] ?? 4] as EndCause };
}
