import { sparkplugSources } from '../expandSparkplug.js';
import { type Path, pathText } from '../faults.js';
import type { SiteBlock, UnitBlock } from '../schema/site.js';
import { type CrossFault, cross, repeated } from './cross.js';

/** What is wrong between the keys of channels that come by Sparkplug. */
export function sparkplugFaults(site: SiteBlock): CrossFault[] {
  const entries: { name: string; path: Path }[] = [];
  const faults = site.units.flatMap((unit, u) => {
    const base: Path = ['units', u];
    const { sources, paths, unplaced } = sparkplugSources(unit);
    sources.forEach(({ group, node, device, metric }, i) => {
      const name = [group, node, device ?? '', metric].join('/');
      entries.push({ name, path: [...base, ...paths[i]!, 'metric'] });
    });
    return [
      ...unplaced.map(({ path, lacks }) => ({
        ...cross([...base, ...path, 'payload'], 'sparkplug', `a ${lacks} to find its metrics at`, {
          others: [[...base, 'sparkplug']],
          hint: `set sparkplug.${lacks} here or for the unit`,
        }),
      })),
      ...blocksOf(unit).flatMap(({ block, path }) => blockFaults(block, [...base, ...path])),
    ];
  });
  return [
    ...faults,
    ...repeated(entries, 'a metric that nothing else uses', pathText),
    ...ownNodeFaults(site),
  ];
}

interface Block {
  readonly payload: string;
  readonly metric?: string | readonly string[] | undefined;
  readonly sparkplug?: object | undefined;
  readonly topic?: string | undefined;
  readonly positions_m?: readonly number[];
}

function blocksOf(unit: UnitBlock): { block: Block; path: Path }[] {
  return [
    ...unit.stores.flatMap((store, s) =>
      store.strings.map((block, k) => ({ block, path: ['stores', s, 'strings', k] as Path })),
    ),
    ...unit.channels.map((block, c) => ({ block, path: ['channels', c] as Path })),
  ];
}

function blockFaults(block: Block, path: Path): CrossFault[] {
  const { payload, metric, sparkplug, topic, positions_m } = block;
  const others: Path[] = [[...path, 'payload']];
  if (payload !== 'sparkplug') {
    const expected = `no such key: payload is ${payload}`;
    return [
      ...(metric === undefined ? [] : [cross([...path, 'metric'], metric, expected, { others })]),
      ...(sparkplug === undefined
        ? []
        : [cross([...path, 'sparkplug'], sparkplug, expected, { others })]),
    ];
  }
  const faults: CrossFault[] = [];
  if (topic !== undefined) {
    const expected = 'no topic: a metric is found by group, node and device';
    faults.push(cross([...path, 'topic'], topic, expected, { others }));
  }
  const count = positions_m?.length ?? 1;
  if (Array.isArray(metric) && metric.length !== count) {
    const where = { others: [[...path, 'positions_m']] };
    const expected = `${count} metrics, one for each of positions_m`;
    faults.push({
      ...cross([...path, 'metric'], undefined, expected, where),
      found: `${metric.length}`,
    });
  }
  return faults;
}

/** rockhour must not read what it has published itself. */
function ownNodeFaults(site: SiteBlock): CrossFault[] {
  const own = site.mqtt.sparkplug_node;
  if (own === undefined) return [];
  const path: Path = ['mqtt', 'sparkplug_node', 'node'];
  const reads = site.units
    .flatMap((unit) => sparkplugSources(unit).sources)
    .some(({ group, node }) => group === own.group && node === own.node);
  const expected = 'another name than that of an edge node that readings come from';
  return reads ? [cross(path, own.node, expected)] : [];
}
