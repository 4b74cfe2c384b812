import { signal } from '@preact/signals';

const query = window.matchMedia('(prefers-color-scheme: dark)');

/** Whether the page is dark now: a canvas takes its inks from the style sheet when it is made. */
export const dark = signal(query.matches);
query.addEventListener('change', () => {
  dark.value = query.matches;
});

/** The value of a colour of the style sheet, such as `--ink`. */
export const inkOf = (name: string): string =>
  getComputedStyle(document.documentElement).getPropertyValue(name).trim();
