import { signal } from '@preact/signals';

const NAME_KEY = 'rockhour.who';

function stored(): string {
  try {
    return localStorage.getItem(NAME_KEY) ?? '';
  } catch {
    // Storage may be forbidden; the name is then typed anew at each visit.
    return '';
  }
}

/** Whose word it is: recorded with every command. */
export const who = signal(stored());

export function rememberWho(): void {
  try {
    localStorage.setItem(NAME_KEY, who.value.trim());
  } catch {
    // As above.
  }
}
