/** Checks of arguments: misuse throws a RangeError that names the argument and the value. */

export function requirePositive(name: string, value: number): number {
  if (!(value > 0 && value < Number.POSITIVE_INFINITY)) {
    throw new RangeError(`${name} must be a finite number above 0, got ${value}`);
  }
  return value;
}

export function requireNotNegative(name: string, value: number): number {
  if (!(value >= 0 && value < Number.POSITIVE_INFINITY)) {
    throw new RangeError(`${name} must be a finite number of at least 0, got ${value}`);
  }
  return value;
}

/** A share that may be 1 but not 0, such as an efficiency. */
export function requireEfficiency(name: string, value: number): number {
  if (!(value > 0 && value <= 1)) {
    throw new RangeError(`${name} must lie above 0 and not above 1, got ${value}`);
  }
  return value;
}

export function requireAscending(name: string, values: readonly number[]): void {
  for (let i = 0; i < values.length; i++) {
    const value = values[i];
    if (value === undefined || !Number.isFinite(value)) {
      throw new RangeError(`${name}[${i}] must be a finite number, got ${value}`);
    }
    const before = values[i - 1];
    if (before !== undefined && !(value > before)) {
      throw new RangeError(`${name} must ascend, got ${before} before ${value} at index ${i}`);
    }
  }
}
