import { s } from '../lib/dom.js';
import type { StoreDefinition, StoreProfile } from '../lib/wire.js';
import { type Frame, ticks } from './frame.js';
import { sensorMark } from './section.js';

/** The scale of temperatures, with the store's two references and the limit of its outlet. */
export function temperatureScale(frame: Frame, store: StoreDefinition): SVGElement {
  const { top, bottom } = frame.bed;
  const group = s('g', { class: 'scale' });
  const count = (frame.plot.right - frame.plot.left) / 64;
  for (const degree of ticks(frame.range_degC[0], frame.range_degC[1], count)) {
    const x = frame.t(degree);
    group.append(
      s('path', { class: 'grid', d: `M${x},${top} V${bottom}` }),
      s('text', { x, y: bottom + 16, 'text-anchor': 'middle' }, String(degree).replace('-', '−')),
    );
  }
  group.append(
    s('path', { class: 'edge', d: `M${frame.plot.left},${bottom} H${frame.plot.right}` }),
    s('text', { x: frame.plot.right, y: bottom + 33, 'text-anchor': 'end', class: 'small' }, '°C'),
  );
  for (const reference of [store.reference_cold_degC, store.reference_hot_degC]) {
    const x = frame.t(reference);
    group.append(s('path', { class: 'reference', d: `M${x},${top} V${bottom}` }));
  }
  if (store.outlet_limit_degC !== null) {
    // A discharge leaves at the charge inlet: the limit belongs to that end.
    const x = frame.t(store.outlet_limit_degC);
    const y = frame.y(0);
    const inward = Math.sign(frame.y(1) - y);
    group.append(
      s('path', { class: 'limit', d: `M${x},${y} v${inward * 16} m-4,0 h8` }),
      s(
        'text',
        {
          x: store.kind === 'hot' ? x - 7 : x + 7,
          y: y + inward * 16 + 4,
          class: 'small',
          'text-anchor': store.kind === 'hot' ? 'end' : 'start',
        },
        'outlet limit',
      ),
    );
  }
  return group;
}

/** What is plotted: the store's mean or one of its tubes, with its sigma at each cell [K]. */
export interface Shown {
  readonly temperature_degC: readonly number[];
  readonly sigma_K: readonly number[];
}

/**
 * The mean with the area-weighted sum of the tubes' sigmas: what they would add up to if all their
 * errors pulled the same way, hence never too narrow.
 */
export function shownOf(profile: StoreProfile, store: StoreDefinition, chosen: string): Shown {
  const tube = profile.tubes.find((one) => one.id === chosen);
  if (tube !== undefined) return tube;
  const share = new Map(store.strings.map((string) => [string.id, string.area_share]));
  const sigma_K = profile.mean_degC.map((_, cell) =>
    profile.tubes.reduce((sum, one) => sum + (share.get(one.id) ?? 0) * one.sigma_K[cell]!, 0),
  );
  return { temperature_degC: profile.mean_degC, sigma_K };
}

function line(frame: Frame, x_m: readonly number[], degrees: (cell: number) => number): string[] {
  return x_m.map((x, cell) => `${frame.t(degrees(cell)).toFixed(1)},${frame.y(x).toFixed(1)}`);
}

/** Estimate with a band of two sigma, the other tubes as thin lines, and the readings. */
export function profileLines(
  frame: Frame,
  profile: StoreProfile,
  shown: Shown,
  chosen: string,
): SVGElement {
  const { x_m } = profile;
  const group = s('g', { class: 'profile' });
  const { temperature_degC: degrees, sigma_K: sigma } = shown;
  const low = line(frame, x_m, (cell) => degrees[cell]! - 2 * sigma[cell]!);
  const high = line(frame, x_m, (cell) => degrees[cell]! + 2 * sigma[cell]!);
  group.append(s('polygon', { class: 'band', points: [...low, ...high.reverse()].join(' ') }));
  for (const tube of profile.tubes) {
    if (tube.id === chosen) continue;
    const points = line(frame, x_m, (cell) => tube.temperature_degC[cell]!).join(' ');
    group.append(s('polyline', { class: 'tube', points }));
  }
  const points = line(frame, x_m, (cell) => degrees[cell]!).join(' ');
  group.append(s('polyline', { class: 'estimate', points }));
  for (const reading of profile.readings) {
    if (reading.value_degC === null) continue;
    const mark = sensorMark(frame.t(reading.value_degC), frame.y(reading.position_m), reading, 2.8);
    const aside = chosen !== '' && reading.string !== chosen;
    if (aside) mark.classList.add('aside');
    mark.append(
      s(
        'title',
        {},
        `${reading.id}: ${reading.value_degC.toFixed(1)} °C${reading.verdict ? `, ${reading.verdict}` : ''}`,
      ),
    );
    group.append(mark);
  }
  return group;
}
