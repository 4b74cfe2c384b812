import { clock, dateClock } from './format.js';
import type { Connection, UnitEntry } from './model.js';

export type Trust = 'live' | 'degraded' | 'blind' | 'stale' | 'lost' | 'empty' | 'connecting';

/** How far the figures of a unit may be trusted now; the worst reason wins. */
export function trustOf(connection: Connection, entry: UnitEntry | null): Trust {
  if (connection === 'lost') return 'lost';
  if (connection === 'connecting') return 'connecting';
  if (entry === null || entry.state === null || entry.state.estimate === null) return 'empty';
  if (entry.stale || entry.state.estimate.quality === 'stale') return 'stale';
  const { quality } = entry.state.estimate;
  return quality === 'good' ? 'live' : quality;
}

/** Whether figures are those of an earlier time, and are to look so. */
export const isOld = (trust: Trust): boolean => trust === 'lost' || trust === 'stale';

export const TRUST_WORDS: Readonly<Record<Trust, string>> = {
  live: 'Live',
  degraded: 'Live, degraded',
  blind: 'Blind',
  stale: 'Stale',
  lost: 'Not connected',
  empty: 'No estimate yet',
  connecting: 'Connecting',
};

/** What has to be said before any figure is read; '' where all is well. */
export function bannerText(trust: Trust, entry: UnitEntry | null, lostSince_ms: number): string {
  const time = entry?.state?.estimate?.time;
  const figures = time === undefined ? '' : ` The figures below are those of ${dateClock(time)}.`;
  switch (trust) {
    case 'lost':
      return `Connection lost since ${clock(lostSince_ms)}; trying again.${figures}`;
    case 'stale':
      return `The readings are stale.${figures}`;
    case 'blind':
      return 'The estimate is blind: it is a prediction without readings, and its uncertainty grows.';
    case 'empty':
      return 'There is no estimate of this unit yet: no scan has been taken in.';
    default:
      return '';
  }
}
