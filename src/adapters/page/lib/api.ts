import { type LoggedIn, login, loginWanted } from './login.js';
import type {
  AlarmLists,
  AskedHours,
  History,
  UnitDefinition,
  UnitList,
  UnitState,
} from './wire.js';

/** One thing that was wrong with a question. */
export interface AnswerFault {
  readonly field: string;
  readonly value: unknown;
  readonly expected: string;
}

/** What the server said was wrong, in its own words. */
export class AnswerError extends Error {
  constructor(
    message: string,
    readonly status: number | null,
    /** What of the question was wrong, as far as the server says it field by field. */
    readonly faults: readonly AnswerFault[] = [],
  ) {
    super(message);
    this.name = 'AnswerError';
  }
}

/** Any error in words. */
export const wordsOf = (error: unknown): string =>
  error instanceof AnswerError ? error.message : `This page has a fault: ${error}`;

export type Query = Readonly<Record<string, string | number | boolean | null | undefined>>;

const LIMIT_MS = 15_000;
/** What lies ahead takes seconds to work out, behind what others asked. */
const LONG_LIMIT_MS = 120_000;

/** All questions to the server; `base` is the folder of the page, so any path prefix holds. */
export class Api {
  constructor(private readonly base: string = new URL('.', document.baseURI).href) {}

  streamUrl(profileOf: string | null, lastEventId: string | null): string {
    const url = new URL('api/stream', this.base);
    if (profileOf !== null) url.searchParams.set('profile', profileOf);
    if (lastEventId !== null) url.searchParams.set('last_event_id', lastEventId);
    return url.href;
  }

  /** Who asks, as the server knows it. */
  async whoAmI(): Promise<void> {
    login.value = await this.get<LoggedIn>('api/login');
  }

  /** @throws AnswerError where the token is nobody's */
  async logIn(token: string): Promise<void> {
    login.value = await this.post<LoggedIn>('api/login', { token });
  }

  async logOut(): Promise<void> {
    await this.post('api/logout', {});
  }

  units = () => this.get<UnitList>('api/units');
  unit = (unit: string) => this.get<UnitState & { definition: UnitDefinition }>(this.path(unit));
  alarms = () => this.get<AlarmLists>('api/alarms');
  hours = (unit: string, power_MW: number, signal?: AbortSignal) =>
    this.get<AskedHours>(this.path(unit, 'hours'), { power_MW, stale: 'mark' }, signal);

  history(
    unit: string,
    from: Date,
    to: Date,
    points: number,
    series: readonly string[],
    signal?: AbortSignal,
  ): Promise<History> {
    const query = {
      from: from.toISOString(),
      to: to.toISOString(),
      points,
      series: series.join(','),
    };
    return this.get(this.path(unit, 'history'), query, signal);
  }

  /** `api/units/UNIT/...`, relative to the page. */
  path = (unit: string, ...parts: string[]): string =>
    ['api/units', encodeURIComponent(unit), ...parts].join('/');

  /** Address of an answer, for a link; values that are null or undefined are left out. */
  href(path: string, query: Query = {}): string {
    const url = new URL(path, this.base);
    for (const [name, value] of Object.entries(query)) {
      if (value !== null && value !== undefined) url.searchParams.set(name, String(value));
    }
    return url.href;
  }

  /** @throws AnswerError with the server's own words */
  get<T>(path: string, query: Query = {}, signal?: AbortSignal): Promise<T> {
    return this.ask<T>(this.href(path, query), {}, signal);
  }

  /** @throws AnswerError with the server's own words */
  post<T>(path: string, body: unknown, signal?: AbortSignal): Promise<T> {
    const headers = { 'content-type': 'application/json' };
    return this.ask<T>(
      this.href(path),
      { method: 'POST', headers, body: JSON.stringify(body) },
      signal,
    );
  }

  /** As `get`, for an answer that is worked out first; and as `post`, with a body. */
  ahead<T>(path: string, question: { query?: Query; body?: unknown }, signal: AbortSignal) {
    const { query, body } = question;
    const headers = { 'content-type': 'application/json' };
    const init = body === undefined ? {} : { method: 'POST', headers, body: JSON.stringify(body) };
    return this.ask<T>(this.href(path, query), init, signal, LONG_LIMIT_MS);
  }

  private async ask<T>(
    url: string,
    init: RequestInit,
    ended?: AbortSignal,
    limit_ms = LIMIT_MS,
  ): Promise<T> {
    let answer: Response;
    try {
      const limit = AbortSignal.timeout(limit_ms);
      answer = await fetch(url, {
        ...init,
        signal: ended === undefined ? limit : AbortSignal.any([limit, ended]),
      });
    } catch {
      throw new AnswerError('The server does not answer.', null);
    }
    const body = await answer.json().catch(() => null);
    if (answer.ok && body !== null) return body as T;
    const error = body?.error;
    // Of a question, not of the log-in itself, which says so where it is made.
    if (answer.status === 401 && !url.endsWith('api/login')) loginWanted.value = true;
    throw new AnswerError(
      typeof error?.message === 'string'
        ? error.message
        : `The server answered with status ${answer.status}.`,
      answer.status,
      typeof error?.field === 'string' ? [error, ...(error.others ?? [])] : [],
    );
  }
}
