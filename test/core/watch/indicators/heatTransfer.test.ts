import { describe, expect, it } from 'vitest';
import { HEAT_TRANSFER } from '../../../../src/core/watch/indicators/heatTransfer.js';
import { START_MS, unsound, watchScript } from './filter.js';

const seeds = [1, 2, 3, 4];
/** Charging and discharging for 5 h each, with 2 h of rest after either. */
const mode = (hour: number) =>
  (['charge', 'stand', 'discharge', 'stand'] as const)[
    [5, 7, 12, 14].findIndex((end) => hour % 14 < end)
  ]!;

describe('heat transfer', () => {
  it('of a healthy bed is never degraded, wherever it is against the correlation', () => {
    for (const seed of seeds) {
      const { found, views } = watchScript(
        HEAT_TRANSFER,
        8 * 24,
        (hour) => ({ mode: mode(hour), transfer: { hot: 0.4, cold: -0.4 } }),
        { seed, dt_s: 900 },
      );
      expect(found).toEqual({});
      expect(views.map((v) => v.state)).toEqual(['normal', 'normal']);
      expect(views.map((v) => v.healthy_from)).toEqual(['learned', 'learned']);
    }
  });

  it.each([
    { share: 0.16, within_h: 4 },
    { share: 0.5, within_h: 9 },
  ])('is found at $share of what it was, in the store that it concerns', ({ share, within_h }) => {
    for (const seed of seeds) {
      const { found, of } = watchScript(
        HEAT_TRANSFER,
        48 + within_h,
        (hour) => ({ transfer: { hot: -0.3, cold: hour < 48 ? 0.3 : 0.3 + Math.log(share) } }),
        { seed },
      );
      expect(Object.keys(found)).toEqual(['cold']);
      expect(found.cold).toBeGreaterThan(48);
      const view = of('cold');
      expect(view).toMatchObject({ state: 'degraded', reason: null, unit: '-' });
      expect(view.limit / view.healthy!).toBeCloseTo(0.7, 12);
      expect(view.sentence).toMatch(
        /^Store cold: gas and rock exchange 0\.\d\d \+\/- 0\.\d\d times/,
      );
    }
  });

  it('is found where it was gross from the start, against the configuration', () => {
    const { found, of } = watchScript(HEAT_TRANSFER, 12, () => ({
      transfer: { hot: Math.log(0.16) },
    }));
    expect(Object.keys(found)).toEqual(['hot']);
    expect(of('hot').healthy_from).toBe('configured');
  });

  it('takes nothing from a bed that stands or has no front', () => {
    for (const still of [{ mode: 'stand' as const }, { front: false }]) {
      const { views } = watchScript(HEAT_TRANSFER, 48, () => still);
      for (const view of views)
        expect(view).toMatchObject({
          ...{ state: 'undetermined', reason: 'not_exercised', value: null, sigma: null },
          ...{ score: null, time: null },
        });
    }
  });

  it('takes nothing from a filter that is lost or has its flow guessed', () => {
    for (const doubt of [{ flowKnown: false }, { step: 'missed' as const }]) {
      const { found } = watchScript(HEAT_TRANSFER, 96, (hour) => ({
        transfer: { hot: hour < 48 ? 0 : -2, cold: 0 },
        ...(hour < 48 ? {} : doubt),
      }));
      expect(found).toEqual({});
    }
  });

  it('takes nothing of a time in which the filter moved the offset of a gas thermometer', () => {
    const course = (moved_K: number) => (hour: number) => ({
      // Bent for five hours while the offset comes to what the thermometer is off by.
      transfer: { hot: hour >= 48 && hour < 53 ? -1.2 : 0 },
      inlet_K: { hot: moved_K * Math.min(1, Math.max(0, (hour - 48) / 5)) },
    });
    expect(watchScript(HEAT_TRANSFER, 72, course(15)).found).toEqual({});
    expect(Object.keys(watchScript(HEAT_TRANSFER, 72, course(5)).found)).toEqual(['hot']);
  });

  it('says that a gross fall would be seen only where sigma is small against the limit', () => {
    let told = 0;
    watchScript(HEAT_TRANSFER, 24, () => ({}), {
      each: (_, [hot]) => {
        const found = /exchange \d\.\d\d \+\/- (\d\.\d\d).*still being learned/.exec(hot!.sentence);
        if (found === null) return;
        told++;
        const seen = hot!.sentence.includes('gross fall would be seen by now');
        const twice = 2 * Number(found[1]);
        if (twice > 0.45) expect(seen).toBe(false);
        else if (twice < 0.25) expect(seen).toBe(true);
      },
    });
    expect(told).toBeGreaterThan(2);
  });

  it('says that it is learning, and from when what is healthy stems', () => {
    const seen: string[] = [];
    const { of } = watchScript(HEAT_TRANSFER, 60, () => ({}), {
      each: (_, views) => {
        const state = `${views[0]!.state} ${views[0]!.reason}`;
        if (seen.at(-1) !== state) seen.push(state);
        expect(views.flatMap(unsound)).toEqual([]);
      },
    });
    expect(seen).toEqual(['undetermined not_exercised', 'undetermined learning', 'normal null']);
    expect(of('hot').sentence).toMatch(/as learned (on|from) 2026-01-01/);
    expect(Date.parse(of('hot').time!)).toBeGreaterThan(START_MS);
  });

  it('learns anew after an overhaul', () => {
    const first = watchScript(HEAT_TRANSFER, 60, (hour) => ({
      transfer: { hot: hour < 40 ? 0 : -1 },
    }));
    expect(Object.keys(first.found)).toEqual(['hot']);
    const { of } = watchScript(HEAT_TRANSFER, 60, () => ({ transfer: { hot: -0.6 } }), {
      state: structuredClone(first.state),
      watching: { baseline_from_ms: START_MS },
    });
    expect(of('hot').state).toBe('normal');
    expect(of('hot').healthy).toBeLessThan(0.65);
  });
});
