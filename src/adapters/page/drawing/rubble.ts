import { s, setAttributes } from '../lib/dom.js';
import type { StoreProfile } from '../lib/wire.js';
import type { Frame, Ring } from './frame.js';

const SIZE = 9;
/** Steps of tone; a stone is touched only when its step changes. */
const TONES = 24;

interface Stone {
  readonly element: SVGElement;
  readonly tube: string;
  readonly position_m: number;
  tone: number;
}

/** A small generator of fixed seed (Park & Miller 1988): the same stones at every draw. */
function seeded(seed: number): () => number {
  let state = seed;
  return () => {
    state = (state * 48271) % 2147483647;
    return state / 2147483647;
  };
}

function outline(cx: number, cy: number, random: () => number): string {
  const corners = 6;
  const turn = random() * Math.PI;
  return Array.from({ length: corners }, (_, i) => {
    const angle = turn + (i / corners) * 2 * Math.PI;
    const radius = SIZE * (0.42 + 0.14 * random());
    return `${(cx + radius * Math.cos(angle)).toFixed(1)},${(cy + 0.92 * radius * Math.sin(angle)).toFixed(1)}`;
  }).join(' ');
}

/**
 * The bed as crushed rock. The ink of a stone is its charge: a charged stone is dark on a light
 * page (light on a dark one), a spent one is faint, in the hot store as in the cold one. It says
 * at a glance how full a store is; the figures are in the profile beside it.
 */
export class Rubble {
  readonly element = s('g', { class: 'rubble' });
  private readonly stones: Stone[] = [];

  constructor(
    frame: Frame,
    rings: readonly Ring[],
    private readonly charged: (temperature_degC: number) => number,
  ) {
    const random = seeded(20_260_131);
    const { left, right, top, bottom } = frame.bed;
    const rise = SIZE * 0.86;
    const rows = Math.floor((bottom - top) / rise);
    for (let row = 0; row < rows; row++) {
      const shift = row % 2 === 0 ? 0.5 : 0.98;
      for (let cx = left + SIZE * shift; cx < right - SIZE * 0.4; cx += SIZE) {
        const cy = top + (row + 0.5) * ((bottom - top) / rows);
        const x = cx + (random() - 0.5) * 2;
        const y = cy + (random() - 0.5) * 1.5;
        const radius_m = (x - left) / frame.pixels_per_m;
        const ring = rings.find((one) => radius_m < one.outer_m) ?? rings.at(-1);
        if (ring === undefined) continue;
        const element = s('polygon', { points: outline(x, y, random) });
        this.element.append(element);
        // The bed's y runs with or against x; the frame knows.
        const along = Math.abs(y - frame.y(0)) / frame.pixels_per_m;
        this.stones.push({ element, tube: ring.id, position_m: along, tone: -1 });
      }
    }
  }

  update(profile: StoreProfile | null): void {
    const tubes = new Map(profile?.tubes.map((tube) => [tube.id, tube.temperature_degC]));
    for (const stone of this.stones) {
      const temperatures = tubes.get(stone.tube) ?? profile?.mean_degC;
      const tone =
        profile === null || temperatures === undefined
          ? 0
          : this.toneAt(profile.x_m, temperatures, stone.position_m);
      if (tone === stone.tone) continue;
      stone.tone = tone;
      setAttributes(stone.element, { 'fill-opacity': (0.1 + (0.78 * tone) / TONES).toFixed(3) });
    }
  }

  private toneAt(x_m: readonly number[], temperatures: readonly number[], at_m: number): number {
    const last = x_m.length - 1;
    const pitch = last > 0 ? (x_m[last]! - x_m[0]!) / last : 1;
    const cell = Math.min(last, Math.max(0, Math.round((at_m - x_m[0]!) / pitch)));
    const charge = this.charged(temperatures[cell]!);
    return Math.round(TONES * Math.min(1, Math.max(0, charge)));
  }
}
