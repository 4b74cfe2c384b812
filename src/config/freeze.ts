/** Freezes a value with all it holds; typed arrays cannot be frozen and stay as they are. */
export function deepFreeze<T>(value: T): T {
  if (value === null || typeof value !== 'object' || ArrayBuffer.isView(value)) return value;
  // Materials come frozen and are shared between units; there is nothing to do below them.
  if (Object.isFrozen(value)) return value;
  Object.freeze(value);
  for (const part of Object.values(value)) deepFreeze(part);
  return value;
}
