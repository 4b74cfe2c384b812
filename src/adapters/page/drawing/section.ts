import type { Mode } from '../../../core/definitions.js';
import { s } from '../lib/dom.js';
import type { Reading, StoreDefinition, StoreState } from '../lib/wire.js';
import { type Frame, type Ring, ticks } from './frame.js';

/** The unmoving parts of the half section: centre line, wall, ends, ground, scale of heights. */
export function vessel(frame: Frame, store: StoreDefinition): SVGElement {
  const { left, right, top, bottom } = frame.bed;
  const group = s('g', { class: 'vessel' });
  group.append(
    s('path', { class: 'wall', d: `M${left},${top} H${right} V${bottom} H${left}` }),
    s('path', { class: 'centre', d: `M${left},${top - 14} V${bottom + 12}` }),
    s('path', { class: 'ground', d: `M${left - 4},${bottom + 1.5} H${right + 8}` }),
  );
  for (const metre of ticks(0, store.length_m, store.length_m * frame.pixels_per_m > 240 ? 8 : 5)) {
    const y = frame.y(metre);
    group.append(
      s('path', { class: 'tick', d: `M${left - 5},${y} H${left}` }),
      s('text', { x: left - 8, y: y + 4, 'text-anchor': 'end' }, String(metre)),
    );
  }
  const inlet = frame.y(0);
  const away = inlet < frame.y(1) ? -1 : 1;
  group.append(s('text', { x: 2, y: inlet + away * 18 + 4, class: 'small' }, 'm'));
  return group;
}

/** Arrows of the gas at both ends, in the direction in which it goes through the bed now. */
export function gasArrows(frame: Frame, mode: Mode | null): SVGElement {
  const group = s('g', { class: 'gas' });
  if (mode === null || mode === 'stand') return group;
  const sign = Math.sign(frame.y(1) - frame.y(0)) * (mode === 'charge' ? 1 : -1);
  const { top, bottom, left, right } = frame.bed;
  const x = left + 0.42 * (right - left);
  const label = (y: number, text: string) => s('text', { x: x + 9, y, class: 'small' }, text);
  group.append(arrow(x, top - 13, sign), arrow(x, bottom + 28, sign));
  group.append(
    label(top - 9, sign > 0 ? 'gas in' : 'out'),
    label(bottom + 32, sign > 0 ? 'out' : 'gas in'),
  );
  return group;
}

/** A filled arrow of 16 px; `sign` 1 points down the drawing. */
function arrow(x: number, y: number, sign: number): SVGElement {
  const tip = y + sign * 8;
  const neck = y + sign * 1;
  const tail = y - sign * 8;
  return s('path', {
    d: `M${x},${tip} L${x - 5},${neck} H${x - 1.5} V${tail} H${x + 1.5} V${neck} H${x + 5} Z`,
  });
}

/** The strings with their thermocouples: used, rejected (a cross) or missing (an empty ring). */
export function strings(
  frame: Frame,
  rings: readonly Ring[],
  readings: readonly Reading[],
): SVGElement {
  const group = s('g', { class: 'strings' });
  for (const ring of rings) {
    const x = frame.r(ring.string_m);
    const own = readings.filter((reading) => reading.string === ring.id);
    const heights = own.map((reading) => frame.y(reading.position_m));
    if (heights.length === 0) continue;
    group.append(
      s('path', { class: 'wire', d: `M${x},${Math.min(...heights)} V${Math.max(...heights)}` }),
    );
    for (const reading of own)
      group.append(sensorMark(x, frame.y(reading.position_m), reading, 2.2));
    group.append(
      s('text', { x, y: frame.bed.bottom + 12, class: 'small', 'text-anchor': 'middle' }, ring.id),
    );
  }
  return group;
}

export function sensorMark(x: number, y: number, reading: Reading, size: number): SVGElement {
  if (reading.verdict !== null && reading.value_degC !== null) {
    const d = size * 1.5;
    return s('path', {
      class: 'rejected',
      d: `M${x - d},${y - d} L${x + d},${y + d} M${x - d},${y + d} L${x + d},${y - d}`,
    });
  }
  if (reading.value_degC === null) {
    // Larger than a reading, on a ground of its own: it has to be seen among charged rock.
    return s(
      'g',
      {},
      s('circle', { class: 'ground', cx: x, cy: y, r: size * 3.3 }),
      s('circle', { class: 'missing', cx: x, cy: y, r: size * 1.9 }),
    );
  }
  return s('circle', { class: 'used', cx: x, cy: y, r: size });
}

/** Where the front stands in each stream tube: level steps where the tubes are alike. */
export function tubeFronts(
  frame: Frame,
  rings: readonly Ring[],
  state: Pick<StoreState, 'strings'> | null,
  length_m: number,
): SVGElement {
  const group = s('g', { class: 'tube-fronts' });
  for (const ring of rings) {
    const position = state?.strings.find((string) => string.id === ring.id)?.position_m ?? null;
    // Beyond an end the tube is all charged or all spent: there is no step to be drawn.
    if (position === null || position < 0 || position > length_m) continue;
    const y = frame.y(position);
    group.append(s('path', { d: `M${frame.r(ring.inner_m)},${y} H${frame.r(ring.outer_m)}` }));
  }
  return group;
}
