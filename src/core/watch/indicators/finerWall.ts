import type { BedDefinition } from '../../definitions.js';
import type { WallLayer, WallModel } from '../../track/wallZone.js';

/** A wall zone with its layers cut, and where the temperatures of each piece come from at first. */
export interface FinerWall {
  readonly wall: WallModel;
  /** Layer of the coarser zone; -1 = the tube. */
  readonly from: readonly number[];
}

/** Pieces are about so many thicknesses of the last layer, and inwards of the string. */
const OUTWARDS = 1.5;
const INWARDS = 3;

interface Piece {
  readonly inner: number;
  readonly outer: number;
  readonly from: number;
}

/**
 * The wall zone, and the tube beside it, cut to about one and a half times the thickness of the zone's last layer. While the
 * tracker only needs what they hold together, how fast heat comes to the string hangs on their
 * thickness: coarse layers pass it on early, and a coarse tube thins it out. The tube is what is left
 * of it at the string itself, two pieces thick.
 *
 * @param string_m radius of the outermost string [m]
 * @param coarse as `wallModel` makes it: perhaps one layer inwards of the string, then the outer ones
 */
export function finerWall(bed: BedDefinition, string_m: number, coarse: WallModel): FinerWall {
  const radius = bed.diameter_m / 2;
  const area = (inner: number, outer: number): number => (outer ** 2 - inner ** 2) / radius ** 2;
  const parts = partsOf(radius, coarse);
  const tube = parts.find(({ from }) => from === -1) as Piece;
  const last = parts.at(-1) as Piece;
  const thickness = last.outer - last.inner;
  const half = Math.min(thickness, (tube.outer - tube.inner) / 2);
  const middle = Math.min(tube.outer - half, Math.max(tube.inner + half, string_m));
  const own: Piece = { inner: middle - half, outer: middle + half, from: -1 };
  const at = parts.indexOf(tube);
  const outwards = [{ ...tube, inner: own.outer }, ...parts.slice(at + 1)];
  const inwards = [...parts.slice(0, at), { ...tube, outer: own.inner }].reverse();
  const layers: WallLayer[] = [];
  const from: number[] = [];
  const add = (piece: Piece, beside: Piece, towards: number): void => {
    const share = area(piece.inner, piece.outer);
    const edge = piece.inner >= beside.outer - 1e-9 ? piece.inner : piece.outer;
    const apart = Math.abs(piece.inner + piece.outer - beside.inner - beside.outer) / 2;
    layers.push({
      share,
      flowFactor: piece.from < 0 ? 1 : (coarse.layers[piece.from] as WallLayer).flowFactor,
      towards,
      radial_1_m2: (2 * Math.PI * edge) / (share * bed.area_m2) / apart,
      volumeRatio: share / area(beside.inner, beside.outer),
    });
    from.push(piece.from);
  };
  const walk = (pieces: readonly Piece[]): void => {
    let beside = own;
    let towards = -1;
    for (const piece of pieces) {
      add(piece, beside, towards);
      towards = layers.length - 1;
      beside = piece;
    }
  };
  walk(inwards.flatMap((piece) => cut(piece, INWARDS * thickness).reverse()));
  walk(outwards.flatMap((piece) => cut(piece, OUTWARDS * thickness)));
  return { wall: { ...coarse, layers }, from };
}

/** What lies inwards of the tube, the tube, and the layers up to the wall, from the axis outwards. */
function partsOf(radius: number, { layers, ringShare, share }: WallModel): Piece[] {
  const inner = layers.filter(({ towards }) => towards === -1).length - 1;
  const own = ringShare - share;
  const order: { share: number; from: number }[] = layers.map((layer, from) => ({
    share: layer.share,
    from,
  }));
  order.splice(inner, 0, { share: own, from: -1 });
  let square = 1 - ringShare;
  return order.map((part) => {
    const from = radius * Math.sqrt(Math.max(0, square));
    square += part.share;
    return { inner: from, outer: radius * Math.sqrt(square), from: part.from };
  });
}

function cut(piece: Piece, most_m: number): Piece[] {
  const whole = piece.outer - piece.inner;
  if (whole < 1e-6) return [];
  const count = Math.max(1, Math.round(whole / most_m));
  return Array.from({ length: count }, (_, i) => ({
    inner: piece.inner + (i * whole) / count,
    outer: piece.inner + ((i + 1) * whole) / count,
    from: piece.from,
  }));
}
