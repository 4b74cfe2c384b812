import type {
  AlarmLists,
  AskedHours,
  History,
  StreamState,
  UnitDefinition,
  UnitList,
  UnitState,
} from './wire.js';

/** What the server said was wrong, in its own words. */
export class AnswerError extends Error {
  constructor(
    message: string,
    readonly status: number | null,
  ) {
    super(message);
    this.name = 'AnswerError';
  }
}

const LIMIT_MS = 15_000;

/** All questions to the server; `base` is the folder of the page, so any path prefix holds. */
export class Api {
  constructor(private readonly base: string = new URL('.', document.baseURI).href) {}

  streamUrl(profileOf: string | null, lastEventId: string | null): string {
    const url = new URL('api/stream', this.base);
    if (profileOf !== null) url.searchParams.set('profile', profileOf);
    if (lastEventId !== null) url.searchParams.set('last_event_id', lastEventId);
    return url.href;
  }

  units = () => this.ask<UnitList>('api/units');
  unit = (unit: string) =>
    this.ask<UnitState & { definition: UnitDefinition }>(`api/units/${encodeURIComponent(unit)}`);
  profile = (unit: string) =>
    this.ask<NonNullable<StreamState['profile']>>(`api/units/${encodeURIComponent(unit)}/profile`);
  hours = (unit: string, power_MW: number) =>
    this.ask<AskedHours>(
      `api/units/${encodeURIComponent(unit)}/hours?power_MW=${power_MW}&stale=mark`,
    );
  alarms = () => this.ask<AlarmLists>('api/alarms');

  history(
    unit: string,
    from: Date,
    to: Date,
    points: number,
    series: readonly string[],
  ): Promise<History> {
    const query = new URLSearchParams({
      from: from.toISOString(),
      to: to.toISOString(),
      points: String(points),
      series: series.join(','),
    });
    return this.ask(`api/units/${encodeURIComponent(unit)}/history?${query}`);
  }

  async acknowledge(id: string, who: string): Promise<void> {
    await this.ask('api/alarms/acknowledge', {
      method: 'POST',
      headers: { 'content-type': 'application/json' },
      body: JSON.stringify({ id, who }),
    });
  }

  private async ask<T>(path: string, init: RequestInit = {}): Promise<T> {
    let answer: Response;
    try {
      answer = await fetch(new URL(path, this.base), {
        ...init,
        signal: AbortSignal.timeout(LIMIT_MS),
      });
    } catch {
      throw new AnswerError('The server does not answer.', null);
    }
    const body = await answer.json().catch(() => null);
    if (answer.ok && body !== null) return body as T;
    const message = body?.error?.message;
    throw new AnswerError(
      typeof message === 'string' ? message : `The server answered with status ${answer.status}.`,
      answer.status,
    );
  }
}
