/** How many times as deep as usual the dear random tests search (`ROCKHOUR_TEST_DEPTH`). */
export const DEPTH = Number(process.env.ROCKHOUR_TEST_DEPTH ?? 1);
if (!Number.isInteger(DEPTH) || DEPTH < 1) {
  throw new RangeError(
    `ROCKHOUR_TEST_DEPTH is ${process.env.ROCKHOUR_TEST_DEPTH}; expected a whole number of at least 1`,
  );
}

/** Runs of a dear random test: so many in a usual run, more in a deep one. */
export function runs(usual: number): number {
  return usual * DEPTH;
}
