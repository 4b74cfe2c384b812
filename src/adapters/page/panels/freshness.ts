import { byId, h, setAttributes, setText } from '../lib/dom.js';
import { ageText, clock, dateClock, QUALITY_WORDS } from '../lib/format.js';
import { ageNow, type PageModel, type UnitEntry } from '../lib/model.js';

type Trust = 'live' | 'degraded' | 'blind' | 'stale' | 'lost' | 'empty' | 'connecting';

/** How far the figures may be trusted now; the worst reason wins. */
export function trustOf(model: PageModel, entry: UnitEntry | null): Trust {
  if (model.connection === 'lost') return 'lost';
  if (model.connection === 'connecting') return 'connecting';
  if (entry === null || entry.state === null || entry.state.estimate === null) return 'empty';
  if (entry.stale || entry.state.estimate.quality === 'stale') return 'stale';
  const { quality } = entry.state.estimate;
  return quality === 'good' ? 'live' : quality;
}

const WORDS: Record<Trust, string> = {
  live: 'Live',
  degraded: 'Live, degraded',
  blind: 'Blind',
  stale: 'Stale',
  lost: 'Not connected',
  empty: 'No estimate yet',
  connecting: 'Connecting',
};

function bannerText(trust: Trust, entry: UnitEntry | null, model: PageModel): string {
  const time = entry?.state?.estimate?.time;
  const figures = time === undefined ? '' : ` The figures below are those of ${dateClock(time)}.`;
  switch (trust) {
    case 'lost':
      return `Connection lost since ${clock(model.lostSince_ms)}; trying again.${figures}`;
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

/** Age of the data, always in the same place, and a banner wherever they must not be trusted. */
export function freshnessPanel(model: PageModel): () => void {
  const word = h('strong', { 'data-field': 'trust' });
  const age = h('span', { 'data-field': 'age' });
  const root = byId('freshness');
  const what = h('span', { class: 'what' }, 'newest reading ');
  root.append(
    h('span', { class: 'sign', 'aria-hidden': 'true' }),
    h('p', {}, word, ' · ', what, age),
  );
  const banner = byId('banner');

  return () => {
    const entry = model.unit;
    const trust = trustOf(model, entry);
    setAttributes(root, { 'data-trust': trust });
    setText(word, WORDS[trust]);
    const seconds = entry === null ? null : ageNow(entry);
    setText(age, seconds === null ? 'not there yet' : `${ageText(seconds)} old`);
    const quality = entry?.state?.estimate?.quality;
    setAttributes(root, {
      title: quality === undefined ? null : `Estimate ${QUALITY_WORDS[quality]}`,
    });
    setText(banner, bannerText(trust, entry, model));
    setAttributes(banner, { 'data-trust': trust });
    const old = trust === 'lost' || trust === 'stale';
    setAttributes(byId('main'), { 'data-old': old });
    const count = model.standing.filter((event) => event.state === 'unacknowledged').length;
    const sign = trust === 'lost' || trust === 'stale' ? `${WORDS[trust]} · ` : '';
    const title = `${count > 0 ? `(${count}) ` : ''}${sign}${entry?.name ?? model.site} · rockhour`;
    if (document.title !== title) document.title = title;
  };
}
