import type { LimitsDefinition, OutageDefinition } from '../definitions.js';
import { ceilingsBetween } from './ceilings.js';

/** What the connection lets through [W]. */
export interface ConnectionNow {
  readonly export_max_W: number;
  readonly import_max_W: number;
}

/** What binds at a time, and what will soon. */
export interface LimitsAhead {
  /** null = no connection is configured. */
  readonly connection: {
    readonly now: ConnectionNow;
    /** When it next lets through another power, within the time looked ahead; null = it does not. */
    readonly next: (ConnectionNow & { readonly time_ms: number }) | null;
  } | null;
  /** Outages that stand or begin within the time looked ahead. */
  readonly outages: readonly OutageDefinition[];
}

/** How far ahead of a time limits are told [ms]: longer than any day-ahead market looks. */
export const AHEAD_MS = 2 * 86_400_000;

/** Connection and outages as they are at a time (epoch [ms]), and within two days of it. */
export function limitsAhead(limits: LimitsDefinition, now_ms: number): LimitsAhead {
  const until_ms = now_ms + AHEAD_MS;
  const outages = (limits.outages ?? []).filter(
    (outage) => outage.to_ms > now_ms && outage.from_ms < until_ms,
  );
  const { connection } = limits;
  if (connection === undefined) return { connection: null, outages };
  const windows = ceilingsBetween({ ...limits, outages: [] }, now_ms, until_ms);
  const at = (t_s: number): ConnectionNow => {
    const open = windows.filter((window) => window.from_s <= t_s && window.to_s > t_s);
    return {
      export_max_W: Math.min(...open.map((window) => window.discharge_max_W)),
      import_max_W: Math.min(...open.map((window) => window.charge_max_W)),
    };
  };
  const now = at(0);
  const edges = windows.flatMap((window) => [window.from_s, window.to_s]);
  const next = edges
    .filter((edge) => edge > 0 && edge * 1000 < AHEAD_MS)
    .sort((a, b) => a - b)
    .map((edge) => ({ ...at(edge), time_ms: now_ms + edge * 1000 }))
    .find((c) => c.export_max_W !== now.export_max_W || c.import_max_W !== now.import_max_W);
  return { connection: { now, next: next ?? null }, outages };
}
