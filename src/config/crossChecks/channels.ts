import { expandString } from '../expand.js';
import { type Path, pathText } from '../faults.js';
import type { ChannelBlock } from '../schema/channels.js';
import type { UnitBlock } from '../schema/site.js';
import { type CrossFault, cross, repeated } from './cross.js';
import { rawUnitFaults } from './rawUnit.js';

export function channelFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const at = (i: number): Path => [...path, 'channels', i];
  return [
    ...idFaults(unit, path),
    ...repeated(
      unit.channels.map((c, i) => ({ name: roleName(c), path: [...at(i), 'measures'] })),
      'one channel for each quantity',
      pathText,
    ),
    ...unit.channels.flatMap((c, i) => [
      ...storeReferenceFaults(unit, c, path, at(i)),
      ...('thermocouple_type' in c ||
      ('unit' in c && c.unit === 'mV') ||
      'cold_junction' in c ||
      'cold_junction_degC' in c
        ? rawUnitFaults(c as Parameters<typeof rawUnitFaults>[0], at(i))
        : []),
    ]),
    ...junctionFaults(unit, path),
    ...flowFaults(unit, path),
    ...silenceFaults(unit, path),
  ];
}

/** `time` is the first column of a recording. */
const RESERVED_IDS = ['time'];

function idFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const entries: { name: string; path: Path }[] = [];
  unit.stores.forEach((store, s) => {
    store.strings.forEach((string, k) => {
      const base: Path = [...path, 'stores', s, 'strings', k, 'ids'];
      const explicit = Array.isArray(string.ids);
      expandString(unit.id, store, string, '').ids.forEach((name, i) => {
        entries.push({ name, path: explicit ? [...base, i] : base });
      });
    });
  });
  unit.channels.forEach((c, i) => {
    entries.push({ name: c.id, path: [...path, 'channels', i, 'id'] });
  });
  const seen = new Set<string>();
  const twice = repeated(entries, 'a channel id that is used once in the unit', pathText).filter(
    (f) => {
      // A pattern without {n} repeats itself at one place; once said is enough.
      const key = pathText(f.path);
      return !seen.has(key) && seen.add(key);
    },
  );
  const reserved = entries
    .filter((e) => RESERVED_IDS.includes(e.name.toLowerCase()))
    .map((e) => cross(e.path, e.name, 'another id: time is the first column of a recording'));
  return [...twice, ...reserved];
}

/** What a channel measures, so that a second channel of the same is found. */
function roleName(c: ChannelBlock): string {
  switch (c.measures) {
    case 'flow':
      return `flow ${c.sense}`;
    case 'gas_temperature':
      return `gas_temperature ${c.store} ${c.end}`;
    case 'valve':
      // Several valves may make one direction.
      return `valve ${c.id}`;
    case 'pressure':
    case 'pressure_drop':
      return `${c.measures} ${c.store}`;
    case 'shell_temperature':
      return `shell_temperature ${c.store} ${c.position_m}`;
    case 'cold_junction':
      return `cold_junction ${c.group}`;
    default:
      return c.measures;
  }
}

function storeReferenceFaults(
  unit: UnitBlock,
  c: ChannelBlock,
  path: Path,
  at: Path,
): CrossFault[] {
  if (!('store' in c)) return [];
  const ids = unit.stores.map((s) => s.id);
  const idPaths = unit.stores.map((_, i): Path => [...path, 'stores', i, 'id']);
  const index = ids.indexOf(c.store);
  if (index < 0) {
    return [
      cross([...at, 'store'], c.store, `a store of this unit: ${ids.join(', ')}`, {
        others: idPaths,
      }),
    ];
  }
  const height = unit.stores[index]!.bed.height_m;
  if (c.measures === 'shell_temperature' && c.position_m > height) {
    return [
      cross([...at, 'position_m'], c.position_m, `a place along the bed, from 0 to ${height} m`, {
        others: [[...path, 'stores', index, 'bed', 'height_m']],
      }),
    ];
  }
  return [];
}

function junctionFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const junctions = unit.channels.filter((c) => c.measures === 'cold_junction').map((c) => c.id);
  const expected =
    junctions.length > 0
      ? `the id of a cold_junction channel: ${junctions.join(', ')}`
      : 'the id of a cold_junction channel, of which there is none';
  const users: { id: string | undefined; path: Path }[] = [
    ...unit.stores.flatMap((store, s) =>
      store.strings.map((string, k) => ({
        id: string.cold_junction,
        path: [...path, 'stores', s, 'strings', k, 'cold_junction'],
      })),
    ),
    ...unit.channels.map((c, i) => ({
      id: 'cold_junction' in c ? c.cold_junction : undefined,
      path: [...path, 'channels', i, 'cold_junction'],
    })),
  ];
  const others: Path[] = [[...path, 'channels']];
  return users.flatMap((u) =>
    u.id !== undefined && !junctions.includes(u.id)
      ? [cross(u.path, u.id, expected, { others })]
      : [],
  );
}

function flowFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const list: Path = [...path, 'channels'];
  const has = (word: string) => unit.channels.some((c) => c.measures === word);
  const senses = unit.channels.flatMap((c) => (c.measures === 'flow' ? [c.sense] : []));
  const say = (found: string, expected: string, hint: string): CrossFault[] => [
    { ...cross(list, undefined, expected, { hint }), found },
  ];
  if (senses.length === 0 && !has('power')) {
    return say(
      'neither a flow nor a power channel',
      'a channel that measures flow or power',
      'without either nothing tells how fast the fronts travel',
    );
  }
  if (senses.length > 1 && (senses.includes('signed') || senses.includes('unsigned'))) {
    return say(
      `flow channels with sense ${senses.join(', ')}`,
      'one flow channel, or one with sense charge and one with sense discharge',
      'a signed or an unsigned meter stands alone',
    );
  }
  if (senses.length === 1 && (senses[0] === 'charge' || senses[0] === 'discharge')) {
    const other = senses[0] === 'charge' ? 'discharge' : 'charge';
    return say(
      `a flow channel with sense ${senses[0]} only`,
      `one with sense ${other} too`,
      'with a meter in one direction only the other direction would read as standing',
    );
  }
  if (senses.includes('unsigned') && !has('mode') && !has('valve') && !has('power')) {
    return say(
      'an unsigned flow without anything that tells the direction',
      'a mode, valve or power channel beside an unsigned flow',
      'charging and discharging would look the same',
    );
  }
  return [];
}

function silenceFaults(unit: UnitBlock, path: Path): CrossFault[] {
  const period: Path = [...path, 'scan_period_s'];
  const blocks = [
    ...unit.stores.flatMap((store, s) =>
      store.strings.map((string, k) => ({
        r: string.reporting,
        path: [...path, 'stores', s, 'strings', k, 'reporting'] as Path,
      })),
    ),
    ...unit.channels.map((c, i) => ({
      r: c.reporting,
      path: [...path, 'channels', i, 'reporting'] as Path,
    })),
  ];
  return blocks.flatMap(({ r, path: at }) =>
    r?.kind === 'by_exception' && r.longest_silence_s < unit.scan_period_s
      ? [
          cross(
            [...at, 'longest_silence_s'],
            r.longest_silence_s,
            `at least the scan period (${unit.scan_period_s} s), else the channel is periodic`,
            { others: [period] },
          ),
        ]
      : [],
  );
}
