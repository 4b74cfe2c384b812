/**
 * One time-aligned set of readings of a unit. `values[i]` belongs to `unit.channels[i]`, in SI
 * units (K, kg/s, W, Pa); NaN is a missing or bad reading. A mode channel holds +1 (charge),
 * 0 (stand) or -1 (discharge). `held[i]` is 1 where a channel that reports by exception was
 * silent and its last value was carried on.
 */
export interface Scan {
  /** Source time [ms since 1970-01-01T00:00:00Z]. */
  readonly time_ms: number;
  readonly values: Float64Array;
  readonly held: Uint8Array;
}
