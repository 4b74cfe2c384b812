import { describe, expect, it } from 'vitest';
import type { UnitDefinition } from '../../src/core/definitions.js';
import { type Block, faultsOf, siteOf } from './sites.js';

/** hot-air with its first string and its first channel by Sparkplug. */
function bySparkplug(data: Block, changes: Block = {}): void {
  const unit = data.units[0];
  unit.sparkplug = { group: 'Quarry', node: 'PLC1', device: 'Bed' };
  const string = unit.stores[0].strings[0];
  delete string.topic;
  delete string.reporting;
  Object.assign(string, { payload: 'sparkplug' }, changes.string);
  delete unit.channels[0].topic;
  Object.assign(unit.channels[0], { payload: 'sparkplug' }, changes.channel);
  if ('unit' in changes) unit.sparkplug = changes.unit;
}

const site = (changes?: Block) => siteOf('hot-air', (data) => bySparkplug(data, changes));
const faults = (changes?: Block, more: (data: Block) => void = () => undefined) =>
  faultsOf('hot-air', (data) => {
    bySparkplug(data, changes);
    more(data);
  }).map(({ path, expected }) => `${path}: ${expected}`);
const reporting = (unit: UnitDefinition, id: string) =>
  unit.channels.find((channel) => channel.id === id)!.reporting;

describe('channels by Sparkplug', () => {
  it('are metrics by their ids where nothing else is said, and no topics', () => {
    const { sparkplug, sources, units } = site();
    const ids = units[0]!.channels.flatMap(({ id, role }) =>
      role.kind === 'thermocouple' && role.string === (units[0]!.channels[0]!.role as Block).string
        ? [id]
        : [],
    );
    const at = { unit: units[0]!.id, group: 'Quarry', node: 'PLC1', device: 'Bed' };
    const flow = sparkplug!.at(-1)!.channel;
    expect(sparkplug).toEqual([...ids, flow].map((id) => ({ ...at, channel: id, metric: id })));
    const others = sources.flatMap(({ channels }) => channels);
    expect(others.filter((id) => id === flow || ids.includes(id))).toEqual([]);
    expect(others.length + sparkplug!.length).toBe(units[0]!.channels.length);
  });

  it('report by exception unless told', () => {
    const made = site();
    const { channel } = made.sparkplug![0]!;
    expect(reporting(made.units[0]!, channel)).toEqual({
      ...{ kind: 'by_exception', deadband: 0, longest_silence_s: 86_400 },
    });
    const told = site({ string: { reporting: { kind: 'periodic' } } });
    expect(reporting(told.units[0]!, channel)).toEqual({ kind: 'periodic' });
    const json = siteOf('hot-air', (data) => delete data.units[0].stores[0].strings[0].reporting);
    expect(reporting(json.units[0]!, channel)).toEqual({ kind: 'periodic' });
  });

  it("have metrics by a pattern or a list, and a nearer group, node or device before the unit's", () => {
    const { sparkplug } = site({
      string: { metric: '{store}/{string}/TT{n}', sparkplug: { device: 'Hot' } },
      channel: { metric: 'Loop/Flow', sparkplug: { node: 'PLC2' } },
    });
    expect(sparkplug![1]).toMatchObject({ node: 'PLC1', device: 'Hot' });
    expect(sparkplug![1]!.metric).toMatch(/^\w+\/\w+\/TT02$/);
    expect(sparkplug!.at(-1)).toMatchObject({ node: 'PLC2', device: 'Bed', metric: 'Loop/Flow' });
  });

  it('are refused where their metrics cannot be found, or are told twice', () => {
    expect(faults({ unit: { group: 'Quarry' } })).toEqual([
      'units[0].stores[0].strings[0].payload: a node to find its metrics at',
      'units[0].channels[0].payload: a node to find its metrics at',
    ]);
    expect(faults({ string: { metric: 'same' } })[0]).toMatch(
      /strings\[0\]\.metric: a metric that nothing else uses/,
    );
    expect(faults({ string: { metric: ['a', 'b'] } })[0]).toMatch(
      /strings\[0\]\.metric: \d+ metrics/,
    );
    expect(faults({ string: { topic: 'x/y' } })[0]).toMatch(/strings\[0\]\.topic: no topic/);
    expect(faults({ channel: { payload: 'value', metric: 'm' } })).toEqual([
      'units[0].channels[0].metric: no such key: payload is value',
    ]);
    expect(faults({ channel: { payload: 'value', sparkplug: { node: 'n' } } })).toEqual([
      'units[0].channels[0].sparkplug: no such key: payload is value',
    ]);
    expect(faults({ unit: { group: 'a/b', node: 'PLC1' } })[0]).toMatch(/sparkplug\.group: /);
  });

  it('are not those of rockhour itself', () => {
    const own = (node: string) => (data: Block) => {
      data.mqtt = { ...data.mqtt, sparkplug_node: { group: 'Quarry', node } };
    };
    expect(faults({}, own('PLC1'))).toEqual([
      'mqtt.sparkplug_node.node: another name than that of an edge node that readings come from',
    ]);
    const made = siteOf('hot-air', (data) => {
      bySparkplug(data);
      own('rockhour')(data);
    });
    expect(made.mqtt.sparkplug_node).toEqual({ group: 'Quarry', node: 'rockhour' });
    expect(siteOf('hot-air').mqtt.sparkplug_node).toBeNull();
  });
});
