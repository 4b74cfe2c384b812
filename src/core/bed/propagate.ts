import type { BedTangent, TangentRows } from './tangent.js';

/** Numbers per cell of the packed coefficients. */
const WIDTH = 8;

/** Coefficients of a tangent in the order of the flow, side by side for each cell: scratch. */
export const createPropagation = (cells: number): Float64Array => new Float64Array(WIDTH * cells);

/**
 * P <- F P F' for a symmetric row-major matrix whose first `cells` rows are temperatures; the states
 * of the parameters stay as they are. Symmetric to the bit.
 *
 * First A = F P down the columns, then A F' along the rows. F carries heat along the flow, so only
 * the half of A F' on the side that the flow comes from is formed and mirrored, and of A only what
 * that half reads: row r up to the cell after r.
 *
 * @param packed scratch of `createPropagation`
 */
export function propagate(
  tangent: BedTangent,
  matrix: Float64Array,
  size: number,
  rows: TangentRows,
  packed: Float64Array,
): void {
  const { cells, forward } = tangent;
  pack(tangent, rows, packed);
  for (let j = 0; j < size; j += LANES) {
    const end = j < cells ? cells : size;
    const to = Math.min(j + LANES, end);
    // Columns of the parameters are wanted whole.
    const from = j >= cells ? 0 : Math.max(0, (forward ? j : cells - to) - 1);
    sweep(tangent, matrix, rows, packed, size, j, to - 1, 1, from, cells);
    if (to === cells) j = cells - LANES;
  }
  for (let i = 0; i < cells; i += LANES) {
    const to = Math.min(i + LANES, cells);
    sweep(tangent, matrix, rows, packed, 1, i, to - 1, size, 0, forward ? to : cells - i);
  }
  mirror(matrix, size, cells, forward);
}

function pack(tangent: BedTangent, { parameters }: TangentRows, packed: Float64Array): void {
  const { cells, forward, own, gas, left, right, pickup, pickupHeat } = tangent;
  const first = parameters[0]?.column;
  const second = parameters[1]?.column;
  const ahead = forward ? right : left;
  const behind = forward ? left : right;
  for (let n = 0; n < cells; n++) {
    const i = forward ? n : cells - 1 - n;
    const at = n * WIDTH;
    packed[at] = own[i] as number;
    packed[at + 1] = gas[i] as number;
    packed[at + 2] = ahead[i] as number;
    packed[at + 3] = behind[i] as number;
    packed[at + 4] = 1 - (pickup[i] as number);
    packed[at + 5] = pickupHeat[i] as number;
    packed[at + 6] = first === undefined ? 0 : (first[i] as number);
    packed[at + 7] = second === undefined ? 0 : (second[i] as number);
  }
}

/** Vectors that one sweep carries side by side: their recursions do not wait for one another. */
const LANES = 4;

/**
 * F on the vectors `lane` to `last` (at most LANES; fewer are done more than once) of a matrix, in
 * place: its element n along the flow stands at lane * laneStep + n * step from the flow's beginning.
 *
 * @param from first element in the order of the flow that is wanted: before it only the gas is followed
 * @param to element after the last that is wanted
 */
function sweep(
  tangent: BedTangent,
  matrix: Float64Array,
  rows: TangentRows,
  packed: Float64Array,
  step: number,
  lane: number,
  last: number,
  laneStep: number,
  from: number,
  to: number,
): void {
  const { cells, forward } = tangent;
  const o0 = lane * laneStep;
  const o1 = Math.min(lane + 1, last) * laneStep;
  const o2 = Math.min(lane + 2, last) * laneStep;
  const o3 = Math.min(lane + 3, last) * laneStep;
  const flowing = tangent.flowing && rows.inlet >= 0;
  const heat = flowing ? tangent.inletHeatCapacity : 0;
  const inlet = flowing ? rows.inlet * step : 0;
  let e0 = heat * (matrix[o0 + inlet] as number);
  let e1 = heat * (matrix[o1 + inlet] as number);
  let e2 = heat * (matrix[o2 + inlet] as number);
  let e3 = heat * (matrix[o3 + inlet] as number);
  // Without a parameter its column is zero, whatever is read for it.
  const first = (rows.parameters[0]?.row ?? 0) * step;
  const a0 = matrix[o0 + first] as number;
  const a1 = matrix[o1 + first] as number;
  const a2 = matrix[o2 + first] as number;
  const a3 = matrix[o3 + first] as number;
  const second = (rows.parameters[1]?.row ?? 0) * step;
  const b0 = matrix[o0 + second] as number;
  const b1 = matrix[o1 + second] as number;
  const b2 = matrix[o2 + second] as number;
  const b3 = matrix[o3 + second] as number;
  const along = forward ? step : -step;
  let at = forward ? 0 : (cells - 1) * step;
  let t0 = matrix[o0 + at] as number;
  let t1 = matrix[o1 + at] as number;
  let t2 = matrix[o2 + at] as number;
  let t3 = matrix[o3 + at] as number;
  let p0 = 0;
  let p1 = 0;
  let p2 = 0;
  let p3 = 0;
  let c = 0;
  for (let n = 0; n < from; n++) {
    const keep = packed[c + 4] as number;
    const pick = packed[c + 5] as number;
    c += WIDTH;
    at += along;
    e0 = keep * e0 + pick * t0;
    e1 = keep * e1 + pick * t1;
    e2 = keep * e2 + pick * t2;
    e3 = keep * e3 + pick * t3;
    p0 = t0;
    p1 = t1;
    p2 = t2;
    p3 = t3;
    t0 = matrix[o0 + at] as number;
    t1 = matrix[o1 + at] as number;
    t2 = matrix[o2 + at] as number;
    t3 = matrix[o3 + at] as number;
  }
  for (let n = from; n < to; n++) {
    const own = packed[c] as number;
    const gas = packed[c + 1] as number;
    const ahead = packed[c + 2] as number;
    const behind = packed[c + 3] as number;
    const keep = packed[c + 4] as number;
    const pick = packed[c + 5] as number;
    const g1 = packed[c + 6] as number;
    const g2 = packed[c + 7] as number;
    c += WIDTH;
    // Behind the last cell there is none: its `ahead` is zero.
    const next = n + 1 < cells ? at + along : at;
    const u0 = matrix[o0 + next] as number;
    const u1 = matrix[o1 + next] as number;
    const u2 = matrix[o2 + next] as number;
    const u3 = matrix[o3 + next] as number;
    matrix[o0 + at] = own * t0 + gas * e0 + ahead * u0 + behind * p0 + g1 * a0 + g2 * b0;
    matrix[o1 + at] = own * t1 + gas * e1 + ahead * u1 + behind * p1 + g1 * a1 + g2 * b1;
    matrix[o2 + at] = own * t2 + gas * e2 + ahead * u2 + behind * p2 + g1 * a2 + g2 * b2;
    matrix[o3 + at] = own * t3 + gas * e3 + ahead * u3 + behind * p3 + g1 * a3 + g2 * b3;
    e0 = keep * e0 + pick * t0;
    e1 = keep * e1 + pick * t1;
    e2 = keep * e2 + pick * t2;
    e3 = keep * e3 + pick * t3;
    p0 = t0;
    p1 = t1;
    p2 = t2;
    p3 = t3;
    t0 = u0;
    t1 = u1;
    t2 = u2;
    t3 = u3;
    at = next;
  }
}

/** What was formed of the rows of cells, over to the other half. */
function mirror(matrix: Float64Array, size: number, cells: number, forward: boolean): void {
  for (let i = 0; i < cells; i++) {
    const row = i * size;
    const from = forward ? 0 : i + 1;
    const to = forward ? i : cells;
    for (let j = from; j < to; j++) matrix[j * size + i] = matrix[row + j] as number;
    for (let j = cells; j < size; j++) matrix[j * size + i] = matrix[row + j] as number;
  }
}
