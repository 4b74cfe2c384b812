import type { StoreProfile } from '../lib/wire.js';
import type { PlayedMoment } from './wire.js';

/** Moments of the past along time; pure. */

/** Neighbours further apart than this many spacings have a gap between. */
const GAP = 2;

export const secondsOf = ({ time }: Pick<PlayedMoment, 'time'>): number => Date.parse(time) / 1000;

/** The moment nearest to a time, null where none was stored within a spacing of it. */
export function nearest<T extends Pick<PlayedMoment, 'time'>>(
  moments: readonly T[],
  at_s: number,
  every_s: number,
): T | null {
  let best: T | null = null;
  let apart = every_s;
  for (const moment of moments) {
    const own = Math.abs(secondsOf(moment) - at_s);
    if (own > apart) continue;
    apart = own;
    best = moment;
  }
  return best;
}

/** The stored moment before (-1) or after (1) a time; null at the ends. */
export function neighbour<T extends Pick<PlayedMoment, 'time'>>(
  moments: readonly T[],
  at_s: number,
  way: -1 | 1,
): T | null {
  const beyond = (moment: T) => way * (secondsOf(moment) - at_s) > 0.5;
  return (way > 0 ? moments.find(beyond) : moments.findLast(beyond)) ?? null;
}

/** Stretches within which nothing was stored: [from, to] in seconds. */
export function gapsOf(
  moments: readonly Pick<PlayedMoment, 'time'>[],
  every_s: number,
): [number, number][] {
  return moments.slice(1).flatMap((moment, i): [number, number][] => {
    const from = secondsOf(moments[i]!);
    const to = secondsOf(moment);
    return to - from > GAP * every_s ? [[from, to]] : [];
  });
}

/** A profile that can be drawn: a band of no width where sigmas were not asked for. */
export function drawable(profile: PlayedMoment['stores'][string]): StoreProfile {
  return {
    ...profile,
    tubes: profile.tubes.map((tube) => ({
      ...tube,
      sigma_K: tube.sigma_K ?? tube.temperature_degC.map(() => 0),
    })),
  };
}

/** Position of a store's fronts at a moment [m]; none where the bed is uniform. */
export function frontsAt(moment: PlayedMoment, store: string): number[] {
  const fronts = moment.estimate?.stores[store]?.fronts ?? [];
  return fronts.flatMap(({ position_m }) => (position_m === null ? [] : [position_m]));
}

const two = (value: number) => String(value).padStart(2, '0');

/** A time as a `datetime-local` field has it. */
export function localField(ms: number): string {
  const at = new Date(ms);
  const day = `${at.getFullYear()}-${two(at.getMonth() + 1)}-${two(at.getDate())}`;
  return `${day}T${two(at.getHours())}:${two(at.getMinutes())}`;
}
