import { signal } from '@preact/signals';

/** The sheets of the page, one for each who reads it, and one for all units at once. */
export const SHEETS = ['now', 'rock', 'offer', 'site'] as const;
export type Sheet = (typeof SHEETS)[number];

export interface Route {
  readonly sheet: Sheet;
  /** Part of the sheet that is meant, as in `#now/alarms`; '' is the sheet as such. */
  readonly part: string;
}

/** `#rock/strings` -> the sheet and its part; what is no sheet is the first one. */
export function routeOf(hash: string): Route {
  const [first = '', ...rest] = hash.replace(/^#/, '').split('/');
  const sheet = SHEETS.find((name) => name === first);
  return sheet === undefined ? { sheet: 'now', part: '' } : { sheet, part: rest.join('/') };
}

export const hrefOf = (sheet: Sheet, part = ''): string =>
  part === '' ? `#${sheet}` : `#${sheet}/${part}`;

/** Where the page is, from its address: it survives a reload and can be passed on. */
export const route = signal<Route>(routeOf(location.hash));

window.addEventListener('hashchange', () => {
  route.value = routeOf(location.hash);
});

/** The unit of the address, `?unit=`. */
export const unitOfAddress = (): string | null => new URLSearchParams(location.search).get('unit');

export function putUnitInAddress(unit: string): void {
  history.replaceState(null, '', `?unit=${encodeURIComponent(unit)}${location.hash}`);
}
