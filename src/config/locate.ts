import { type Document, isMap, isNode, isScalar, isSeq, type LineCounter } from 'yaml';
import type { Path } from './faults.js';

/** Line [1...] of the value at a path, or of its key; for what is missing the line of its parent. */
export function lineOf(document: Document.Parsed, lines: LineCounter, path: Path): number | null {
  let node: unknown = document.contents;
  let offset = isNode(node) ? node.range?.[0] : undefined;
  for (const part of path) {
    if (isMap(node)) {
      const pair = node.items.find(
        (item) => String(isScalar(item.key) ? item.key.value : item.key) === part,
      );
      if (pair === undefined) break;
      const keyAt = isNode(pair.key) ? pair.key.range?.[0] : undefined;
      offset = keyAt ?? offset;
      node = pair.value;
    } else if (isSeq(node) && typeof part === 'number') {
      node = node.items[part];
      offset = (isNode(node) ? node.range?.[0] : undefined) ?? offset;
    } else break;
  }
  return offset === undefined ? null : lines.linePos(offset).line;
}
