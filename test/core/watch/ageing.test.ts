import { describe, expect, it } from 'vitest';
import type { Mode } from '../../../src/core/definitions.js';
import { ageViews, startAgeing } from '../../../src/core/watch/ageing.js';
import type { IndicatorView } from '../../../src/core/watch/indicator.js';

const T0 = Date.UTC(2026, 0, 1);
const H = 3_600_000;

const viewAt = (time_ms: number | null, over: Partial<IndicatorView> = {}): IndicatorView => ({
  ...{ kind: 'pressure_drop', subject: 'hot', unit: '-', value: 1.01, sigma: 0.02, healthy: 1 },
  ...{ healthy_from: 'learned', limit: 1.15, deadband: 0.05, on_delay_s: 600, off_delay_s: 7200 },
  ...{ score: 0, state: 'normal', reason: null, sentence: 'Store hot: as ever.' },
  time: time_ms === null ? null : new Date(time_ms).toISOString(),
  ...over,
});

/** The view after so many hours of a mode each, scanned every 10 min, with one value at the start. */
function later(view: IndicatorView, modes: readonly (readonly [Mode, number])[]) {
  const ageing = startAgeing();
  let time_ms = T0;
  let seen = view;
  for (const [mode, hours] of modes) {
    for (let n = 0; n < 6 * hours; n++) {
      time_ms += 600_000;
      seen = ageViews(ageing, [view], { mode, time_ms, dt_s: 600 })[0]!;
    }
  }
  return seen;
}

describe('ageing of what is normal', () => {
  it('leaves open what ten values of flow have told nothing of, whatever it stood between', () => {
    const fresh = viewAt(T0);
    expect(later(fresh, [['charge', 10]])).toBe(fresh);
    const old = later(fresh, [
      ['charge', 6],
      ['stand', 30],
      ['discharge', 8],
    ]);
    expect(old).toMatchObject({ state: 'undetermined', reason: 'too_uncertain', value: 1.01 });
    expect(old.sentence).toMatch(/at 2026-01-01 00:00 UTC; 10 h of flow since then/);
    // Short runs never come to where the flow would show it.
    const short = Array.from({ length: 40 }, (_, n) => [n % 2 ? 'charge' : 'stand', 1] as const);
    expect(later(fresh, short)).toBe(fresh);
  });

  it('counts rests for what shows while standing, and all for what always shows', () => {
    const leak = viewAt(T0, { kind: 'valve_leak', healthy: 0, limit: 0.0025, sigma: 0.0004 });
    expect(later(leak, [['charge', 60]]).state).toBe('normal');
    expect(later(leak, [['stand', 24]]).state).toBe('undetermined');
    const gas = viewAt(T0, { kind: 'gas_inventory', healthy: 0, limit: 0.03, sigma: 0.004 });
    expect(later(gas, [['stand', 12]]).state).toBe('normal');
    expect(
      later(gas, [
        ['stand', 12],
        ['charge', 13],
      ]),
    ).toMatchObject({ state: 'undetermined', reason: 'too_uncertain' });
  });

  it('is normal again with a new value', () => {
    const ageing = startAgeing();
    const scan = (view: IndicatorView, hour: number) =>
      ageViews(ageing, [view], { mode: 'charge', time_ms: T0 + hour * H, dt_s: 3600 })[0]!;
    const old = viewAt(T0);
    let seen = old;
    for (let hour = 1; hour < 14; hour++) seen = scan(old, hour);
    expect(seen.state).toBe('undetermined');
    expect(scan(old, 14)).toBe(seen);
    expect(scan(viewAt(T0 + 15 * H), 15).state).toBe('normal');
  });

  it('leaves open what is older than a month, and what its sigma is too large for', () => {
    expect(later(viewAt(T0), [['stand', 31 * 24]])).toMatchObject({ reason: 'not_exercised' });
    const vague = viewAt(T0, { sigma: 0.15 });
    expect(later(vague, [['charge', 1]])).toMatchObject({ reason: 'too_uncertain' });
  });

  it('leaves degraded what is, and undetermined for its own reason', () => {
    const degraded = viewAt(T0, { state: 'degraded', score: 1 });
    expect(later(degraded, [['charge', 100]])).toBe(degraded);
    const blind = viewAt(null, { state: 'undetermined', reason: 'not_instrumented' });
    expect(later(blind, [['charge', 100]])).toBe(blind);
  });

  it('forgets subjects that are gone, and survives a restart', () => {
    const ageing = startAgeing();
    const scan = { mode: 'charge', time_ms: T0, dt_s: 60 } as const;
    ageViews(ageing, [viewAt(T0), viewAt(T0, { subject: 'cold' })], scan);
    ageViews(ageing, [viewAt(T0)], scan);
    expect(Object.keys(ageing.since)).toEqual(['pressure_drop/hot']);
    expect(JSON.parse(JSON.stringify(ageing))).toEqual(ageing);
  });
});
