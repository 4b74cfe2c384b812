/** Frame of a picture: what is drawn lies within, scales and words around. */
export interface Frame {
  readonly width: number;
  readonly height: number;
  readonly left: number;
  readonly right: number;
  readonly top: number;
  readonly bottom: number;
}

export type Scale = (value: number) => number;

/** Straight from one span to another. */
export function scaleOf(from: readonly [number, number], to: readonly [number, number]): Scale {
  const per = (to[1] - to[0]) / (from[1] - from[0] || 1);
  return (value) => Math.round((to[0] + (value - from[0]) * per) * 10) / 10;
}

/** Round marks from 0 to at least `most`, at most `count` steps. */
export function roundMarks(most: number, count: number): number[] {
  const rough = Math.max(most, 1e-6) / count;
  const size = 10 ** Math.floor(Math.log10(rough));
  const step = ([1, 2, 2.5, 5, 10].find((one) => one * size >= rough * (1 - 1e-9)) ?? 10) * size;
  const marks = Math.ceil(most / step - 1e-9);
  return Array.from({ length: marks + 1 }, (_, i) => Number((i * step).toPrecision(12)));
}

/** Path through points `[x, y]`. */
export const pathOf = (points: readonly (readonly [number, number])[]): string =>
  points.map(([x, y], i) => `${i === 0 ? 'M' : 'L'}${x} ${y}`).join('');
