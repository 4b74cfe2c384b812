import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { definitionView } from '../../../src/adapters/http/views.js';
import { frameOf, ringsOf, scaleOf, ticks } from '../../../src/adapters/page/drawing/frame.js';
import type { StoreDefinition } from '../../../src/adapters/page/lib/wire.js';
import { COLD, HOT, unitOf } from '../http/scriptedDefinitions.js';

const stores: StoreDefinition[] = definitionView(unitOf('u', 'U', [HOT, COLD]), 0).stores;
const [hot, cold] = stores as [StoreDefinition, StoreDefinition];
const space = { width: 400, bedHeight: 370, beside: true };

describe('the drawing of a store', () => {
  it('has one scale for all, at which the tallest and the widest bed fit', () => {
    const scale = scaleOf(stores, space);
    const beds = stores.map((store) => frameOf(store, stores, space).bed);
    for (const [i, bed] of beds.entries()) {
      expect(bed.bottom - bed.top).toBeCloseTo(stores[i]!.length_m * scale, 9);
      expect(bed.right - bed.left).toBeCloseTo((stores[i]!.diameter_m / 2) * scale, 9);
      expect(bed.bottom - bed.top).toBeLessThanOrEqual(space.bedHeight + 1e-9);
    }
    expect(beds[0]!.bottom).toBeCloseTo(beds[1]!.bottom, 9);
  });

  it('counts x from the charge inlet, wherever that is', () => {
    const down = frameOf(hot, stores, space);
    expect([down.y(0), down.y(8)]).toEqual([down.bed.top, down.bed.bottom]);
    const up = frameOf(cold, stores, space);
    expect([up.y(0), up.y(6.5)]).toEqual([up.bed.bottom, up.bed.top]);
  });

  it('keeps any temperature on the plot', () => {
    const frame = frameOf(hot, stores, space);
    expect(frame.t(-500)).toBe(frame.plot.left);
    expect(frame.t(2000)).toBe(frame.plot.right);
    expect(frame.t(25)).toBeGreaterThan(frame.plot.left);
    expect(frame.t(500)).toBeLessThan(frame.plot.right);
  });

  it('cuts the section into rings of the shares of area', () => {
    const rings = ringsOf(hot);
    const radius = hot.diameter_m / 2;
    expect(rings[0]!.inner_m).toBe(0);
    expect(rings.at(-1)!.outer_m).toBeCloseTo(radius, 12);
    for (const [i, ring] of rings.entries()) {
      const area = (ring.outer_m ** 2 - ring.inner_m ** 2) / radius ** 2;
      expect(area).toBeCloseTo(hot.strings[i]!.area_share, 12);
      expect(ring.string_m).toBeGreaterThan(ring.inner_m);
      expect(ring.string_m).toBeLessThan(ring.outer_m);
    }
  });

  it('draws strings of one radius apart, each within its own ring', () => {
    const alike = hot.strings.map((string) => ({ ...string, radius_m: 1, area_share: 1 / 3 }));
    const rings = ringsOf({ ...hot, strings: alike });
    const places = rings.map((ring) => ring.string_m);
    expect(new Set(places).size).toBe(3);
    expect([...places].sort((a, b) => a - b)).toEqual(places);
  });
});

describe('ticks', () => {
  it.each([
    [0, 8, 8, [0, 1, 2, 3, 4, 5, 6, 7, 8]],
    [-176, 36, 4, [-100, 0]],
    [0, 0.7, 5, [0, 0.2, 0.4, 0.6]],
  ])('from %d to %d, about %d', (from, to, count, expected) => {
    expect(ticks(from, to, count)).toEqual(expected);
  });
});

/** Relative luminance and contrast ratio after WCAG 2.2. */
function contrast(a: string, b: string): number {
  const luminance = (hex: string) => {
    const [r, g, blue] = [1, 3, 5].map((at) => {
      const c = Number.parseInt(hex.slice(at, at + 2), 16) / 255;
      return c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4;
    }) as [number, number, number];
    return 0.2126 * r + 0.7152 * g + 0.0722 * blue;
  };
  const [light, dark] = [luminance(a), luminance(b)].sort((x, y) => y - x) as [number, number];
  return (light + 0.05) / (dark + 0.05);
}

describe('the inks of the page', () => {
  const css = readFileSync(
    new URL('../../../src/adapters/page/style/base.css', import.meta.url),
    'utf8',
  );
  const schemes = [...css.matchAll(/:root \{([^}]*)\}/g)].map(
    ([, block]) =>
      new Map([...block!.matchAll(/(--[\w-]+): (#\w{6})/g)].map((m) => [m[1]!, m[2]!])),
  );

  it('are two schemes', () => expect(schemes).toHaveLength(2));

  it.each([
    ['--ink', '--paper'],
    ['--soft', '--paper'],
    ['--care', '--paper'],
    ['--urgent', '--paper'],
    ['--care', '--care-paper'],
    ['--urgent', '--urgent-paper'],
  ])('%s on %s can be read: at least 4.5 to 1 (WCAG 2.2, 1.4.3), light and dark', (ink, paper) => {
    for (const scheme of schemes) {
      expect(contrast(scheme.get(ink)!, scheme.get(paper)!)).toBeGreaterThanOrEqual(4.5);
    }
  });
});
