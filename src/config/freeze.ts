/**
 * Freezes a value with all it holds; typed arrays cannot be frozen and stay as they are. A frozen
 * object may hold one that is not, so it is gone through as well; configurations have no cycles.
 */
export function deepFreeze<T>(value: T): T {
  if (value === null || typeof value !== 'object' || ArrayBuffer.isView(value)) return value;
  Object.freeze(value);
  for (const part of Object.values(value)) deepFreeze(part);
  return value;
}
