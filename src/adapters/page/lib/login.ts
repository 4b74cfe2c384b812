import { signal } from '@preact/signals';

export interface LoggedIn {
  /** Whether rockhour asks for tokens at all. */
  readonly asked: boolean;
  /** Name of the token, recorded with what is done. */
  readonly name: string | null;
  readonly role: 'view' | 'acknowledge' | 'configure' | null;
}

/** Who has logged in; null before it is known. */
export const login = signal<LoggedIn | null>(null);

/** The server wants a token: the log-in covers the page until one is let in. */
export const loginWanted = signal(false);

/** The name that is recorded without being typed; null where rockhour asks for no tokens. */
export const ownName = (): string | null => login.value?.name ?? null;
