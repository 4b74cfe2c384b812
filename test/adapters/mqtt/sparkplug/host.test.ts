import type { UMetric } from 'sparkplug-payload/lib/sparkplugbpayload.js';
import { afterEach, describe, expect, it } from 'vitest';
import {
  LOST_AFTER_MS,
  REBIRTH_EVERY_MS,
  UNHEARD_MS,
} from '../../../../src/adapters/mqtt/sparkplug/host.js';
import { Assembler } from '../../../../src/core/scan/assemble.js';
import { EdgeNode, encode, outside } from './edge.js';
import { edgeUnit, harness, T0 } from './hostHarness.js';

const stopping: (() => void)[] = [];
afterEach(() => {
  for (const stop of stopping.splice(0)) stop();
});

const double = (name: string, value: number, alias?: number): UMetric => ({
  ...{ name, type: 'Double', value },
  ...(alias === undefined ? {} : { alias }),
});
/** A value by its alias alone, as data come. */
const byAlias = (alias: number, value: number, rest: Partial<UMetric> = {}): UMetric =>
  ({ alias, type: 'Double', value, ...rest }) as UMetric;
const mode = (value: string): UMetric => ({ name: 'Mode', type: 'String', value });
const BED = (at = 300): UMetric[] => [
  double('Bed/p', 1, 11),
  double('Bed/tt', at, 12),
  double('Bed/e', 3, 13),
  { name: 'Bed/valve', type: 'Boolean', value: true, alias: 14 },
  double('Bed/other', 9, 15),
];

/** With a clock that counts from the year 2000. */
function harness2000() {
  const all = harness();
  all.clock.ms = Date.UTC(2000, 0, 1);
  return { ...all, edge: new EdgeNode() };
}

function born() {
  const all = harness();
  stopping.push(() => {
    all.host.stop();
    all.intake.stop();
  });
  const edge = new EdgeNode();
  all.receive(edge.birth(T0, [mode('charge')]));
  all.receive(edge.deviceBirth('Bed', T0, BED()));
  return { ...all, edge };
}

describe('readings by Sparkplug', () => {
  it('come with births, in the units of their channels, words and switches too', () => {
    const { news, counts } = born();
    expect(news()).toEqual([
      'mode@0=1 good',
      'p@0=1 good',
      'tt@0=573.15 good',
      'e@0=3 good',
      'valve@0=1 good',
    ]);
    // bdSeq, rebirth control and a metric that nobody asked for.
    expect(counts).toMatchObject({ messages: 2, sparkplug_births: 2, sparkplug_unused_metrics: 3 });
  });

  it('come with data, by alias or by name, at the time of the metric, else of the payload', () => {
    const { receive, news, edge, counts } = born();
    news();
    receive(
      edge.data('Bed', T0 + 5000, [byAlias(12, 310), byAlias(13, 4, { timestamp: T0 + 4000 })]),
    );
    receive(edge.data('Bed', T0 + 6000, [double('Bed/p', 2)]));
    receive(edge.data(null, T0 + 7000, [mode('discharge')]));
    expect(news()).toEqual([
      'tt@5000=583.15 good',
      'e@4000=4 good',
      'p@6000=2 good',
      'mode@7000=-1 good',
    ]);
    expect(counts.sparkplug_data).toBe(3);
    expect(counts.sparkplug_seq_gaps).toBeUndefined();
  });

  it('are zero where a zero was sent', () => {
    const { receive, news, edge } = born();
    news();
    receive(
      edge.data('Bed', T0, [
        byAlias(13, 0),
        { alias: 14, type: 'Boolean', value: false } as UMetric,
      ]),
    );
    expect(news()).toEqual(['e@0=0 good', 'valve@0=0 good']);
  });

  it('have their quality from the property, and none where they are null or no number', () => {
    const { receive, news, edge, counts } = born();
    news();
    const quality = (value: number) => ({
      properties: { Quality: { type: 'Int32', value } },
    });
    receive(
      edge.data('Bed', T0 + 1, [
        byAlias(12, 310, quality(192) as Partial<UMetric>),
        byAlias(13, 4, quality(500) as Partial<UMetric>),
        { alias: 11, type: 'Double', value: null, isNull: true } as UMetric,
      ]),
    );
    receive(
      edge.data('Bed', T0 + 2, [
        byAlias(12, 310, quality(0) as Partial<UMetric>),
        byAlias(13, 4, quality(7) as Partial<UMetric>),
        byAlias(11, Number.POSITIVE_INFINITY),
        { alias: 14, type: 'String', value: 'ajar' } as UMetric,
      ]),
    );
    expect(news()).toEqual([
      'tt@1=583.15 good',
      'e@1=NaN bad',
      'p@1=NaN bad',
      'tt@2=NaN bad',
      'e@2=NaN bad',
      'p@2=NaN bad',
      'valve@2=NaN bad',
    ]);
    expect(counts).toMatchObject({ missing_value: 1, unknown_quality: 1, bad_element: 2 });
  });

  it('that are historical keep their own time and leave what stands now', () => {
    const { receive, news, edge } = born();
    news();
    const late = { timestamp: T0 - 3_600_000, isHistorical: true };
    receive(edge.data('Bed', T0 + 9000, [byAlias(12, 250, late), byAlias(12, 311)]));
    receive(edge.deviceDeath('Bed', T0 + 9500));
    expect(news().slice(0, 3)).toEqual([
      'tt@-3600000=523.15 good',
      'tt@9000=584.15 good',
      'p@9500=NaN bad',
    ]);
  });

  it('of a birth are of its time, however long they have stood', () => {
    const { receive, news } = harness();
    const edge = new EdgeNode();
    receive(edge.birth(T0, [{ ...mode('stand'), timestamp: T0 - 7_200_000 }]));
    expect(news()).toEqual(['mode@0=0 good']);
  });
});

describe('deaths', () => {
  it('of the node make all its channels missing at once, at the time that they arrive', () => {
    const { receive, news, edge, clock, counts, host } = born();
    news();
    clock.ms = T0 + 20_000;
    receive(edge.death());
    expect(news()).toEqual(['mode', 'p', 'tt', 'e', 'valve'].map((id) => `${id}@20000=NaN bad`));
    expect(counts).toMatchObject({ sparkplug_deaths: 1, sparkplug_made_missing: 5 });
    expect(host.states).toEqual([{ name: 'Quarry/PLC1', absent: ['edge node dead', 'Bed dead'] }]);
    receive(edge.death());
    expect(news()).toEqual([]);
    expect(counts.sparkplug_foreign_deaths).toBe(1);
  });

  it('count only with the bdSeq of the running birth', () => {
    const { receive, news, edge, counts } = born();
    const before = edge.death();
    edge.bdSeq = 1;
    receive(edge.birth(T0 + 1000, [mode('charge')]));
    receive(edge.deviceBirth('Bed', T0 + 1000, BED()));
    news();
    receive(before);
    expect(news()).toEqual([]);
    expect(counts.sparkplug_foreign_deaths).toBe(1);
    receive(edge.death());
    expect(news()).toHaveLength(5);
  });

  it('of a device leave the node, and its birth brings the device back', () => {
    const { receive, news, edge, counts, asked } = born();
    news();
    receive(edge.deviceDeath('Bed', T0 + 5000));
    expect(news()).toEqual(['p', 'tt', 'e', 'valve'].map((id) => `${id}@5000=NaN bad`));
    receive(edge.data('Bed', T0 + 6000, [byAlias(12, 310)]));
    expect(news()).toEqual([]);
    expect(counts.sparkplug_after_death).toBe(1);
    expect(asked).toHaveLength(1);
    receive(edge.deviceBirth('Bed', T0 + 7000, BED(305)));
    expect(news()).toContain('tt@7000=578.15 good');
  });

  it('are never older than what they end, also where the clocks differ', () => {
    const { receive, news, edge, clock } = born();
    receive(edge.data('Bed', T0 + 60_000, [byAlias(12, 310)]));
    news();
    // The node's clock is a minute ahead of rockhour's.
    clock.ms = T0 + 1000;
    receive(edge.death());
    expect(news()).toContain('tt@60000=NaN bad');
    edge.bdSeq = 1;
    // Its next birth has a clock that was set back.
    receive(edge.birth(T0 + 2000, [mode('charge')]));
    receive(edge.deviceBirth('Bed', T0 + 2000, BED(306)));
    expect(news()).toContain('tt@60000=579.15 good');
  });

  it('and births go by clocks that are right again, after those of node and machine were ahead', () => {
    const { receive, news, edge, clock } = born();
    const ahead = 3650 * 86_400_000;
    clock.ms = T0 + ahead;
    receive(edge.data('Bed', T0 + ahead, [byAlias(12, 310), byAlias(13, 4)]));
    news();
    clock.ms = T0 + 60_000;
    receive(edge.data('Bed', T0 + 60_000, [byAlias(13, 5)]));
    expect(news()).toEqual(['e@60000=5 good']);
    clock.ms = T0 + 90_000;
    receive(edge.deviceDeath('Bed', T0 + 90_000));
    expect(news()).toEqual(['p', 'tt', 'e', 'valve'].map((id) => `${id}@90000=NaN bad`));
    receive(edge.deviceBirth('Bed', T0 + 91_000, BED(306)));
    expect(news()).toContain('tt@91000=579.15 good');
  });

  it('end what stands also where this machine has lost its date', () => {
    const { receive, news, edge, clock } = harness2000();
    receive(edge.birth(T0, [mode('charge')]));
    expect(news()).toEqual(['mode@0=1 good']);
    clock.ms += 1000;
    receive(edge.death());
    expect(news()).toContain('mode@0=NaN bad');
  });

  it('are concluded where a node is born anew and a device does not follow', () => {
    const { receive, news, edge, clock, host } = born();
    news();
    receive(edge.birth(T0 + 1000, [mode('charge')]));
    clock.steady = 9_999;
    host.tick();
    expect(news()).toEqual(['mode@1000=1 good']);
    clock.steady = 10_000;
    clock.ms = T0 + 11_000;
    host.tick();
    expect(news()).toEqual(['p', 'tt', 'e', 'valve'].map((id) => `${id}@11000=NaN bad`));
  });

  it('are assumed of all that was told before a start and before a long loss of the broker', () => {
    const { host, news, clock, counts } = born();
    news();
    host.linkDown();
    clock.steady = LOST_AFTER_MS - 1;
    host.tick();
    expect(news()).toEqual([]);
    clock.steady = LOST_AFTER_MS;
    clock.ms = T0 + 60_000;
    host.tick();
    expect(news()).toEqual(['mode', 'p', 'tt', 'e', 'valve'].map((id) => `${id}@0=NaN bad`));

    const next = harness();
    stopping.push(() => next.host.stop());
    next.intake.remember([
      {
        ...{ unit: 'u', channel: 'tt', value: 1, quality: 'good' },
        time_ms: T0 + 9,
        arrival_ms: T0,
      },
    ]);
    next.host.start(T0);
    expect(next.news()).toEqual(
      ['mode@1', 'p@1', 'tt@9', 'e@1', 'valve@1'].map((id) => `${id}=NaN bad`),
    );
    expect(counts.sparkplug_made_missing).toBe(5);
  });
});

describe('a node that is not heard after the broker was lost for less than a minute', () => {
  /** Lost at 10 s and back at 30 s; what was said until then is taken away. */
  function afterAnOutage() {
    const all = born();
    const { clock, host, news } = all;
    news();
    clock.ms = T0 + 10_000;
    clock.steady = 10_000;
    host.linkDown();
    const go = (steady_ms: number) => {
      clock.steady = steady_ms;
      clock.ms = T0 + steady_ms;
      host.tick();
    };
    go(29_000);
    go(30_000);
    host.linkUp();
    return { ...all, go, back: 30_000 };
  }

  it('is asked three times and then taken for dead, missing since the loss', () => {
    const { host, news, asked, counts, go, back } = afterAnOutage();
    for (let ms = back; ms < back + UNHEARD_MS; ms += 1000) go(ms);
    expect(asked).toHaveLength(3);
    expect(news()).toEqual([]);
    expect(host.states).toEqual([{ name: 'Quarry/PLC1', absent: [] }]);
    go(back + UNHEARD_MS);
    expect(news()).toEqual(['mode', 'p', 'tt', 'e', 'valve'].map((id) => `${id}@10000=NaN bad`));
    expect(counts).toMatchObject({ sparkplug_unheard_nodes: 1, sparkplug_made_missing: 5 });
    expect(host.states).toEqual([{ name: 'Quarry/PLC1', absent: ['edge node dead', 'Bed dead'] }]);
    for (let ms = back + UNHEARD_MS; ms < back + 3 * UNHEARD_MS; ms += 1000) go(ms);
    expect(counts.sparkplug_unheard_nodes).toBe(1);
    expect(asked).toHaveLength(3);
  });

  it('is asked for a birth where it speaks again after all, and lives by that', () => {
    const { receive, news, edge, asked, go, back, host } = afterAnOutage();
    go(back + UNHEARD_MS);
    news();
    const before = asked.length;
    go(200_000);
    receive(edge.data('Bed', T0 + 200_000, [byAlias(12, 310)]));
    expect(asked).toHaveLength(before + 1);
    expect(news()).toEqual([]);
    receive(edge.birth(T0 + 201_000, [mode('charge')]));
    receive(edge.deviceBirth('Bed', T0 + 201_000, BED(310)));
    expect(news()).toContain('tt@201000=583.15 good');
    go(400_000);
    expect(news()).toEqual([]);
    expect(host.states[0]!.absent).toEqual([]);
  });

  it('lives where it answers or goes on in time, and may be silent from then on', () => {
    const answered = afterAnOutage();
    answered.receive(answered.edge.birth(T0 + 40_000, [mode('charge')]));
    answered.receive(answered.edge.deviceBirth('Bed', T0 + 40_000, BED()));
    const goneOn = afterAnOutage();
    goneOn.receive(goneOn.edge.data('Bed', T0 + 40_000, [byAlias(12, 310)]));
    for (const { news, go, counts, asked } of [answered, goneOn]) {
      news();
      for (let ms = 41_000; ms < 400_000; ms += 1000) go(ms);
      expect(news()).toEqual([]);
      expect(counts.sparkplug_unheard_nodes).toBeUndefined();
      expect(asked).toHaveLength(1);
    }
  });

  it('is not taken for dead while the broker is away again, nor for what it could not be heard then', () => {
    const { receive, edge, news, host, go, back, counts } = afterAnOutage();
    go(back + 30_000);
    host.linkDown();
    go(back + UNHEARD_MS + 10_000);
    expect(news()).toEqual([]);
    host.linkUp();
    go(back + UNHEARD_MS + 20_000);
    receive(edge.birth(T0 + back + UNHEARD_MS + 20_000, [mode('charge')]));
    receive(edge.deviceBirth('Bed', T0 + back + UNHEARD_MS + 20_000, BED()));
    go(back + 5 * UNHEARD_MS);
    expect(counts.sparkplug_unheard_nodes).toBeUndefined();
    expect(news().filter((line) => line.includes('bad'))).toEqual([]);
  });

  it('is not heard by what the broker sends once more, and a second loss does not begin it anew', () => {
    const { receive, edge, news, host, go, back, counts } = afterAnOutage();
    receive(edge.data('Bed', T0 + 9000, [byAlias(12, 310)]), { duplicate: true });
    news();
    go(back + 30_000);
    host.linkDown();
    go(back + 40_000);
    host.linkUp();
    go(back + UNHEARD_MS + 9000);
    expect(counts.sparkplug_unheard_nodes).toBeUndefined();
    go(back + UNHEARD_MS + 10_000);
    expect(counts.sparkplug_unheard_nodes).toBe(1);
    expect(news()).toEqual(['mode', 'p', 'tt', 'e', 'valve'].map((id) => `${id}@10000=NaN bad`));
  });
});

describe('scans made of them', () => {
  it('hold what stands while the node lives, have nothing from its death on, and the next birth after', () => {
    const { receive, taken, edge, clock } = born();
    const unit = edgeUnit();
    const options = { deadline_ms: 0, future_tolerance_ms: 300_000, longest_gap_scans: 100 };
    const assembler = new Assembler(unit, options);
    const tt = unit.channels.findIndex(({ id }) => id === 'tt');
    /** Value of tt in the scan that begins after so many periods, and whether it was held. */
    const scan = (i: number) => {
      for (const { channel, time_ms, arrival_ms, value } of taken()) {
        const index = unit.channels.findIndex(({ id }) => id === channel);
        assembler.add({ channel: index, time_ms, arrival_ms, value });
      }
      assembler.closeThrough(T0 / 30_000 + i);
      const found = assembler.take()!.scan;
      return [found.values[tt], found.held[tt]];
    };
    expect(scan(0)).toEqual([573.15, 0]);
    expect(scan(1)).toEqual([573.15, 1]);
    clock.ms = T0 + 61_000;
    receive(edge.death());
    expect(scan(2)).toEqual([Number.NaN, 0]);
    expect(scan(3)).toEqual([Number.NaN, 0]);
    edge.bdSeq = 1;
    clock.ms = T0 + 121_000;
    receive(edge.birth(clock.ms, [mode('charge')]));
    receive(edge.deviceBirth('Bed', clock.ms, BED(310)));
    expect(scan(4)).toEqual([583.15, 0]);
    expect(scan(5)).toEqual([583.15, 1]);
  });
});

describe('a node that is not whole', () => {
  it('is asked to be born again at a start, and not again too soon', () => {
    const { host, asked, clock, counts } = harness();
    clock.isUp = false;
    host.linkUp();
    expect(asked).toEqual([]);
    clock.isUp = true;
    host.tick();
    expect(asked.map(({ topic }) => topic)).toEqual(['spBv1.0/Quarry/NCMD/PLC1']);
    const { metrics } = outside.decodePayload(asked[0]!.payload);
    expect(metrics).toMatchObject([{ name: 'Node Control/Rebirth', type: 'Boolean', value: true }]);
    host.linkUp();
    clock.steady = REBIRTH_EVERY_MS - 1;
    host.tick();
    expect(asked).toHaveLength(1);
    clock.steady = REBIRTH_EVERY_MS;
    host.tick();
    expect(asked).toHaveLength(2);
    expect(counts.sparkplug_rebirth_requests).toBe(2);
  });

  it('is asked where data come before a birth, where one is missing, and where an alias is unknown', () => {
    const early = harness();
    const edge = new EdgeNode();
    early.receive(edge.data('Bed', T0, [double('Bed/p', 1)]));
    expect(early.news()).toEqual([]);
    expect(early.counts.sparkplug_before_birth).toBe(1);
    expect(early.asked).toHaveLength(1);

    const lost = born();
    lost.news();
    lost.edge.swallow();
    lost.receive(lost.edge.data('Bed', T0 + 1, [byAlias(12, 310)]));
    // What did come is a measurement all the same.
    expect(lost.news()).toEqual(['tt@1=583.15 good']);
    expect(lost.counts.sparkplug_seq_gaps).toBe(1);
    lost.receive(lost.edge.data('Bed', T0 + 2, [byAlias(12, 311)]));
    expect(lost.counts.sparkplug_seq_gaps).toBe(1);
    expect(lost.asked).toHaveLength(1);

    const strange = born();
    strange.receive(strange.edge.data('Bed', T0 + 1, [byAlias(99, 310)]));
    expect(strange.counts.sparkplug_unknown_aliases).toBe(1);
    expect(strange.asked).toHaveLength(1);
  });

  it('has a sequence that goes on at 0 after 255, over devices that nothing is read from', () => {
    const { receive, edge, counts, news } = born();
    for (let i = 0; i < 300; i++) {
      receive(edge.data(i % 2 ? 'Bed' : 'Pump', T0 + i, i % 2 ? [byAlias(12, i)] : []));
    }
    expect(counts.sparkplug_seq_gaps).toBeUndefined();
    expect(news()).toHaveLength(5 + 150);
  });

  it('takes the same message twice for one where the broker says so', () => {
    const { receive, edge, counts, news } = born();
    news();
    const sent = edge.data('Bed', T0 + 1, [byAlias(12, 310)]);
    receive(sent);
    receive(sent, { duplicate: true });
    expect(news()).toEqual(['tt@1=583.15 good']);
    expect(counts.repeated).toBe(1);
    expect(counts.sparkplug_seq_gaps).toBeUndefined();
  });

  it('has channels missing that its birth does not name', () => {
    const { receive, edge, counts, news } = born();
    news();
    receive(edge.deviceBirth('Bed', T0 + 1000, BED().slice(1)));
    expect(news()).toContain('p@1000=NaN bad');
    expect(counts.sparkplug_not_in_birth).toBe(1);
  });

  it('is not told by what the broker kept, nor by topics of others', () => {
    const { receive, counts, news } = harness();
    receive(new EdgeNode().birth(T0, [mode('charge')]), { retained: true });
    receive(new EdgeNode('Quarry', 'PLC2').birth(T0, [mode('charge')]));
    receive({ topic: 'spBv1.0/Quarry/NBIRTH/PLC1/Bed', payload: encode({ metrics: [] }) });
    expect(news()).toEqual([]);
    expect(counts).toMatchObject({ messages: 3, sparkplug_retained: 1, unknown_topic: 2 });
  });
});
