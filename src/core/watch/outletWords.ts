import type { Mode, StoreKind } from '../definitions.js';
import type { EndCause } from '../estimate.js';
import { writtenIn } from '../plan/localTime.js';
import { degC, duration } from './messages.js';
import type { ExpectedEnd, RunEndState, ToldEnd } from './runEnd.js';

/** Sentences about the end of a discharge. */

export interface OutletWords {
  readonly store: string;
  readonly kind: StoreKind;
  readonly outlet_K: number;
  readonly stop_K: number;
}

/** `03:40` by the clock of the connection's zone, `03:40 UTC` without one. */
export function clock(zone: string | null, ms: number): string {
  const minute = 60_000 * Math.round(ms / 60_000);
  const text = writtenIn(zone, minute).slice(11, 16);
  return zone === null ? `${text} UTC` : text;
}

const ENDS_BY: Readonly<Record<EndCause, string>> = {
  hot_outlet: 'by the outlet of the hot store',
  cold_outlet: 'by the outlet of the cold store',
  flow: 'as the greatest flow no longer gives this power',
  pressure_drop: 'as the flow for this power exceeds the greatest pressure drop',
  empty: 'as the beds are spent',
};

/** Its place against the limit where the discharge ends. */
function placeOf({ kind, outlet_K, stop_K }: OutletWords): string {
  const margin = kind === 'hot' ? outlet_K - stop_K : stop_K - outlet_K;
  const side = margin < 0 ? 'past' : kind === 'hot' ? 'above' : 'below';
  return `${Math.abs(margin).toFixed(1)} K ${side} the limit of ${degC(stop_K)} where the discharge ends`;
}

function outletOf(words: OutletWords): string {
  if (!Number.isFinite(words.outlet_K)) return 'its outlet is not known now';
  return `its outlet is at ${degC(words.outlet_K)}, ${placeOf(words)}`;
}

export interface EarlyWords extends OutletWords {
  /** IANA zone, null = UTC. */
  readonly zone: string | null;
  readonly told: ToldEnd;
  readonly expected: ExpectedEnd;
}

export function runsOutEarly({ zone, told, expected, ...outlet }: EarlyWords): string {
  const lost_h = (told.end_ms - expected.end_ms) / 3.6e6;
  const at = (ms: number) => clock(zone, ms);
  const lost = `${duration(3600 * lost_h)} earlier than was told at ${at(told.made_ms)}`;
  return (
    `Store ${outlet.store}: at ${(expected.power_W / 1e6).toFixed(2)} MW the discharge ends at ` +
    `${at(expected.end_ms)}, ${ENDS_BY[expected.ends_by]}, ${lost} (${at(told.end_ms)}, firmly ` +
    `${at(told.firm_ms)}); ${outletOf(outlet)}. Until ${at(expected.end_ms)}: lower the power or prepare the ` +
    `change-over, and tell who sells that some ${((lost_h * expected.power_W) / 1e6).toFixed(1)} MWh will be missing.`
  );
}

/** @param isPast it is past its limit while the unit goes on; else nothing was told of the end */
export function outletRaised(words: OutletWords, isPast: boolean): string {
  const drift = words.kind === 'hot' ? 'falling' : 'rising';
  if (isPast)
    return (
      `Store ${words.store}: ${outletOf(words)}, and the unit still discharges. End the discharge or ` +
      'lower the power now.'
    );
  return (
    `Store ${words.store}: ${outletOf(words)}, and ${drift} as the store runs out. Of this discharge no end ` +
    'was told before, as its power or a sound estimate was missing. Prepare the change-over or lower the ' +
    "power, by the control system's own outlet."
  );
}

/** What let it return. */
export function outletReturned(
  store: string,
  zone: string | null,
  mode: Mode,
  why: 'early' | 'past' | 'untold',
  run: RunEndState | null,
): string {
  const start = `Store ${store}: `;
  if (mode !== 'discharge')
    return `${start}the discharge has ended; the unit ${mode === 'charge' ? 'charges' : 'stands'}.`;
  const told = run?.told ?? null;
  if (why === 'untold' || told === null) return `${start}its outlet is away from its limit again.`;
  const power = `${(told.power_W / 1e6).toFixed(2)} MW`;
  const end_ms = run?.expected?.end_ms ?? told.end_ms;
  return `${start}at ${power} the discharge lasts until ${clock(zone, end_ms)}, as is told now.`;
}
