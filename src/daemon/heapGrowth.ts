import { setFlagsFromString } from 'node:v8';

/**
 * How far the heap may grow beyond what lived after the last full collection until the next [%].
 *
 * V8 lets it grow up to fourfold where little time goes into collecting. Arrays of numbers lie outside
 * V8, in malloc's heap, and what was once needed there hardly comes back to the system: so the memory
 * of a daemon that lives on 50 MB crept up for days, with the longest pause between two collections.
 */
const GROWTH_PERCENT = 20;

/** Has V8 collect before garbage is a multiple of what lives. Holds for all threads of the process. */
export function boundHeapGrowth(): void {
  setFlagsFromString(`--heap-growing-percent=${GROWTH_PERCENT}`);
}
