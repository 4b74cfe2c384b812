import { expect, it } from 'vitest';
import { stringify } from 'yaml';
import { type Parsed, parseSite } from '../../src/config/load.js';
import { type Block, CONFIG_FOLDER, exampleData } from './sites.js';

/** Units `a`, `b`, ... of the demonstration, after a change of the file. */
function runnable(count: number, change: (data: Block) => void): Parsed {
  const data = exampleData('demo');
  const [unit] = data.units;
  data.units = Array.from({ length: count }, (_, i) => ({
    ...structuredClone(unit),
    ...{ id: 'abcdef'[i], name: `Unit ${'ABCDEF'[i]}` },
  }));
  change(data);
  return parseSite(stringify(data, { aliasDuplicateObjects: false }), CONFIG_FOLDER, {}, true);
}

function soundOf(parsed: Parsed) {
  if (parsed.faults) throw new Error(JSON.stringify(parsed.faults));
  const { units, sources, left_out = [] } = parsed.site;
  expect(new Set(sources.map(({ unit }) => unit))).toEqual(new Set(units.map(({ id }) => id)));
  return { units: units.map(({ id }) => id), left_out };
}

it('is silent where all is sound', () => {
  const parsed = runnable(2, () => {});
  expect(soundOf(parsed)).toEqual({ units: ['a', 'b'], left_out: [] });
  expect(parsed.site).not.toHaveProperty('left_out');
});

it('leaves faulty units out and runs the others, each fault at its place in the file', () => {
  const parsed = runnable(4, (data) => {
    data.units[0].stores[0].bed.void_fraction = 4;
    data.units[2].machin = {};
    data.units[2].limits.hot_outlet_min_degC = 900;
  });
  const { units, left_out } = soundOf(parsed);
  expect(units).toEqual(['b', 'd']);
  expect(left_out.map(({ id, name }) => [id, name])).toEqual([
    ['a', 'Unit A'],
    ['c', 'Unit C'],
  ]);
  const [a, c] = left_out;
  expect(a!.faults.map(({ path }) => path)).toEqual(['units[0].stores[0].bed.void_fraction']);
  expect(c!.faults.map(({ path }) => path)).toEqual([
    'units[2].limits.hot_outlet_min_degC',
    'units[2].machin',
  ]);
  for (const { line } of [...a!.faults, ...c!.faults]) expect(line).toBeGreaterThan(1);
});

it('gives a name or topic that two claim to the first of them', () => {
  const twice = soundOf(runnable(3, (data) => (data.units[2].id = 'a')));
  expect(twice.units).toEqual(['a', 'b']);
  expect(twice.left_out.map(({ id }) => id)).toEqual(['units[2]']);
  const topic = soundOf(
    runnable(2, (data) => {
      data.units[1].channels[0].topic = 'plant/a/flow';
    }),
  );
  expect(topic.units).toEqual(['a']);
  expect(topic.left_out[0]!.faults[0]!.path).toBe('units[1].channels[0].topic');
});

it.each<[string, (data: Block) => void]>([
  ['a unit that is no block', (data) => (data.units[1] = 'none')],
  ['a unit that is empty', (data) => (data.units[1] = null)],
  ['a unit with an id that is none', (data) => (data.units[1].id = '../x')],
])('calls %s by its place', (_, change) => {
  const { units, left_out } = soundOf(runnable(2, change));
  expect(units).toEqual(['a']);
  expect(left_out.map(({ id, name }) => [id, name === id || name === 'Unit B'])).toEqual([
    ['units[1]', true],
  ]);
});

it.each<[string, (data: Block) => void, string]>([
  ['a fault outside of the units', (data) => (data.mqtt.qos = 7), 'mqtt.qos'],
  ['faults in all of them', (data) => (data.units[0].name = ''), 'units[0].name'],
])('refuses the file with %s, and tells the others as well', (_, change, path) => {
  const parsed = runnable(2, (data) => {
    change(data);
    data.units[1].rated_hours_h = -1;
  });
  expect(parsed.faults?.map((fault) => fault.path)).toEqual(
    expect.arrayContaining([path, 'units[1].rated_hours_h']),
  );
});
