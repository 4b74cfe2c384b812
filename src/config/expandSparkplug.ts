import { expandString, fill } from './expand.js';
import type { Path } from './faults.js';
import type { UnitBlock } from './schema/site.js';
import type { SparkplugSource } from './site.js';

type Where = NonNullable<UnitBlock['sparkplug']>;

/** A metric that lacks the group or the node, and the path of the block that asks for it. */
export interface Unplaced {
  readonly path: Path;
  readonly lacks: 'group' | 'node';
}

/** The metrics of a unit, the path of the block of each, below the unit's, and what is not placed. */
export function sparkplugSources(unit: UnitBlock): {
  readonly sources: readonly SparkplugSource[];
  readonly paths: readonly Path[];
  readonly unplaced: readonly Unplaced[];
} {
  const sources: SparkplugSource[] = [];
  const paths: Path[] = [];
  const unplaced: Unplaced[] = [];
  const add = (
    path: Path,
    own: Where | undefined,
    named: readonly (readonly [string, string])[],
  ) => {
    const { group, node, device } = { ...unit.sparkplug, ...own };
    if (group === undefined || node === undefined) {
      unplaced.push({ path, lacks: group === undefined ? 'group' : 'node' });
      return;
    }
    for (const [channel, metric] of named) {
      sources.push({ unit: unit.id, channel, group, node, device: device ?? null, metric });
      paths.push(path);
    }
  };
  unit.stores.forEach((store, s) => {
    store.strings.forEach((string, k) => {
      if (string.payload !== 'sparkplug') return;
      const { ids, numbers } = expandString(unit.id, store, string, '');
      const metricOf = (id: string, i: number) => {
        if (Array.isArray(string.metric)) return string.metric[i] ?? '';
        const words = { id, store: store.id, string: string.id, n: numbers[i] ?? '' };
        return fill(string.metric ?? '{id}', words);
      };
      const named = ids.map((id, i) => [id, metricOf(id, i)] as const);
      add(['stores', s, 'strings', k], string.sparkplug, named);
    });
  });
  unit.channels.forEach((channel, c) => {
    if (channel.payload !== 'sparkplug') return;
    add(['channels', c], channel.sparkplug, [[channel.id, channel.metric ?? channel.id]]);
  });
  return { sources, paths, unplaced };
}
