import { addToSum, NONE, type SeriesPart, type Sum } from './thin.js';

/** Rows of one layout in one stretch of time, as they are rolled up. */
export interface Bucket {
  /** Time of the last row in it [ms]. */
  last_ms: number;
  readonly sums: readonly Sum[];
}

export function emptyBucket(series: number): Bucket {
  return {
    last_ms: Number.NEGATIVE_INFINITY,
    sums: Array.from({ length: series }, () => ({ ...NONE })),
  };
}

/** Takes a part of the same layout in: a row, or a bucket of a finer level; in any order of time. */
export function addToBucket(bucket: Bucket, part: SeriesPart): void {
  const isLater = part.time_ms >= bucket.last_ms;
  part.names.forEach((name, i) => {
    addToSum(bucket.sums[i]!, name, part, i, isLater);
  });
  bucket.last_ms = Math.max(bucket.last_ms, part.time_ms);
}

/** Means, least and greatest of all series as float64, then the counts as uint32. */
export function packBucket({ sums }: Bucket): Buffer {
  const n = sums.length;
  const bytes = new ArrayBuffer(n * (3 * 8 + 4));
  const figures = new Float64Array(bytes, 0, 3 * n);
  const counts = new Uint32Array(bytes, 3 * 8 * n, n);
  sums.forEach(({ count, mean, least, greatest }, i) => {
    figures[i] = mean;
    figures[n + i] = least;
    figures[2 * n + i] = greatest;
    counts[i] = count;
  });
  return Buffer.from(bytes);
}

export function unpackBucket(
  last_ms: number,
  names: readonly string[],
  content: Buffer,
): SeriesPart {
  // SQLite's buffers are not aligned to eight bytes.
  const { buffer } = Uint8Array.prototype.slice.call(content);
  const n = content.byteLength / (3 * 8 + 4);
  const figures = new Float64Array(buffer, 0, 3 * n);
  return {
    time_ms: last_ms,
    names,
    counts: new Uint32Array(buffer, 3 * 8 * n, n),
    means: figures.subarray(0, n),
    least: figures.subarray(n, 2 * n),
    greatest: figures.subarray(2 * n),
  };
}

/** Some series of a layout, and their places in it. */
export interface Picked {
  readonly names: readonly string[];
  readonly places: readonly number[];
}

/** Few series of a bucket, read where they stand: the rest of it is neither copied nor looked at. */
export function pickFromBucket(
  last_ms: number,
  { names, places }: Picked,
  content: Buffer,
): SeriesPart {
  const n = content.byteLength / (3 * 8 + 4);
  const figures = (block: number) => places.map((i) => content.readDoubleLE(8 * (block * n + i)));
  return {
    time_ms: last_ms,
    names,
    counts: places.map((i) => content.readUInt32LE(3 * 8 * n + 4 * i)),
    means: figures(0),
    least: figures(1),
    greatest: figures(2),
  };
}
