import type { Mode } from '../../../core/definitions.js';
import { s } from '../lib/dom.js';
import { fixed, withSigma } from '../lib/format.js';
import type { StoreProfile, StoreState } from '../lib/wire.js';
import type { Frame } from './frame.js';

export type Front = StoreState['fronts'][number];

/**
 * 1 where the front moves down the drawing now, -1 up, 0 where it does not move.
 * @param along 1 where positions grow downwards, -1 upwards
 */
export function travelOf(along: -1 | 1, mode: Mode | null): -1 | 0 | 1 {
  if (mode === null || mode === 'stand') return 0;
  return mode === 'charge' ? along : (-along as -1 | 1);
}

/** The front in words, with its uncertainties and where it is going. */
export function frontWords(front: Front, travel: -1 | 0 | 1): string {
  if (front.position_m === null) return 'front outside the bed';
  const going = travel === 0 ? 'at rest' : travel > 0 ? 'moving down' : 'moving up';
  const width =
    front.width_m === null ? '' : `, width ${withSigma(front.width_m, front.width_sigma_m, 2)} m`;
  const at = `${withSigma(front.position_m, front.position_sigma_m, 2)} m`;
  return `front ${at}${width}, ${going}`;
}

/**
 * A front across section and plot: a line at its position with a strip of two sigma, an arrow
 * where it moves, and a bracket over the 16 % and 84 % crossings. Its words stand on the side
 * that the profile leaves free.
 */
export function frontMarks(
  frame: Frame,
  front: Front,
  mode: Mode | null,
  profile: StoreProfile | null,
): SVGElement {
  const group = s('g', { class: 'front' });
  const { position_m, position_sigma_m, width_m } = front;
  if (position_m === null) return group;
  const y = frame.y(position_m);
  const from = frame.bed.left - 4;
  const { left, right } = frame.plot;
  if (position_sigma_m !== null) {
    const half = Math.abs(frame.y(position_m + 2 * position_sigma_m) - y);
    group.append(
      s('rect', { class: 'sigma', x: left, y: y - half, width: right - left, height: 2 * half }),
    );
  }
  group.append(s('path', { class: 'line', d: `M${from},${y} H${right}` }));

  const travel = travelOf(frame.y(1) > frame.y(0) ? 1 : -1, mode);
  if (travel !== 0) {
    const x = frame.bed.right + 8;
    group.append(s('path', { class: 'head', d: `M${x - 6},${y} h12 l-6,${travel * 10} Z` }));
  }
  const side = freeSides(frame, profile, position_m);
  if (width_m !== null) {
    const { top, bottom } = frame.bed;
    const within = (at: number) => Math.min(bottom, Math.max(top, at));
    const ends = [position_m - width_m, position_m + width_m].map((at) => within(frame.y(at)));
    const [a, b] = [Math.min(...ends), Math.max(...ends)];
    const atRight = side.below === 'end';
    const x = atRight ? right - 6 : left + 6;
    group.append(
      s('path', {
        class: 'width',
        // What reaches out of the bed ends there without a stroke across.
        d: `${a > top ? `M${x - 4},${a} h8 ` : ''}M${x},${a} V${b}${b < bottom ? ` M${x - 4},${b} h8` : ''}`,
      }),
    );
    const words = `${fixed(width_m, 2)} m`;
    const low = y + 17 > bottom - 2 ? y - 7 : y + 17;
    group.append(label(atRight ? x - 9 : x + 9, low, words, side.below));
  }
  const x = side.above === 'start' ? left + 4 : right - 4;
  group.append(label(x, y - 7, `front ${fixed(position_m, 2)} m`, side.above));
  return group;
}

function label(x: number, y: number, text: string, anchor: 'start' | 'end'): SVGElement {
  return s('text', { x, y, 'text-anchor': anchor, class: 'label' }, text);
}

/** The side of the plot that the profile leaves free above and below a front. */
function freeSides(frame: Frame, profile: StoreProfile | null, position_m: number) {
  const down = frame.y(1) > frame.y(0);
  const beyond = meanAt(profile, position_m, 3);
  const before = meanAt(profile, position_m, -3);
  const hotAbove = down ? before > beyond : beyond > before;
  return hotAbove
    ? ({ above: 'start', below: 'end' } as const)
    : ({ above: 'end', below: 'start' } as const);
}

/** Mean temperature some cells away from a position. */
function meanAt(profile: StoreProfile | null, position_m: number, cells: number): number {
  if (profile === null || profile.x_m.length === 0) return 0;
  const nearest = profile.x_m.findIndex((x) => x >= position_m);
  const cell = (nearest < 0 ? profile.x_m.length - 1 : nearest) + cells;
  return profile.mean_degC[Math.min(profile.mean_degC.length - 1, Math.max(0, cell))] ?? 0;
}
