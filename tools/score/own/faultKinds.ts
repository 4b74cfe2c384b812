import type { StoreDefinition, UnitDefinition } from '../../../src/core/definitions.js';
import type { SensorFault } from '../../../test/plant/faults.js';
import { RandomStream } from '../../../test/plant/random.js';
import type { Recording } from '../recording.js';

/** All faults begin here [h], in the middle of the first charge. */
export const FAULT_H = 3;
/** Drift before which a sensor has to be named, and what makes other faults visible [K]. */
export const VISIBLE_K = 6;

/** A fault as planned for one seed. */
export interface PlannedFault {
  readonly fault: SensorFault;
  readonly store: string;
  /** Sensors that read wrongly. */
  readonly sensors: readonly string[];
}

export interface FaultKind {
  readonly id: string;
  readonly words: string;
  readonly plan: (unit: UnitDefinition, recording: Recording, seed: number) => PlannedFault;
  /** Verdicts that name it. */
  readonly named: readonly string[];
  /**
   * When it becomes visible: at once, when the reading is off by 6 K, or when the front passes the
   * sensor; and how long after that it has to be named [scans].
   */
  readonly visible: 'at_once' | 'off' | 'front';
  readonly within_scans: number;
}

const AT_S = FAULT_H * 3600;
const HALF_HOUR = 30;

const single = (
  id: string,
  words: string,
  named: readonly string[],
  visible: FaultKind['visible'],
  within_scans: number,
  ahead_m: readonly [number, number],
  make: (channel: string, random: RandomStream) => SensorFault,
): FaultKind => ({
  id,
  words,
  named,
  visible,
  within_scans,
  plan: (unit, recording, seed) => {
    const random = new RandomStream(seed, `score ${id}`);
    const store = unit.stores[seed % unit.stores.length]!;
    const sensor = pick(store, recording, random, ahead_m)[0];
    return { fault: make(sensor, random), store: store.id, sensors: [sensor] };
  },
});

const ANYWHERE = [Number.NEGATIVE_INFINITY, Number.POSITIVE_INFINITY] as const;
/** Places that the front passes within the next hours of the charge. */
const AHEAD = [0.6, 2.2] as const;

/** A sensor of the store, chosen among those at some distances ahead of the front, and the next one. */
function pick(
  store: StoreDefinition,
  recording: Recording,
  random: RandomStream,
  [from, to]: readonly [number, number],
): [string, string] {
  const front = recording.truth(`${store.id}.position_0`, FAULT_H * 60);
  const string = store.strings[Math.floor(random.uniform(0, store.strings.length))]!;
  const { thermocouples } = string;
  const fit = thermocouples.filter((t, i) => {
    const ahead = t.position_m - front;
    return i < thermocouples.length - 2 && ahead >= from && ahead <= to;
  });
  const chosen = fit[Math.floor(random.uniform(0, fit.length))] ?? thermocouples[0]!;
  const at = thermocouples.indexOf(chosen);
  return [chosen.id, thermocouples[at + 2]!.id];
}

const sign = (random: RandomStream) => (random.uniform() < 0.5 ? -1 : 1);

const group = (
  id: string,
  words: string,
  named: readonly string[],
  within_scans: number,
  make: (name: string, random: RandomStream) => SensorFault,
): FaultKind => ({
  id,
  words,
  named,
  visible: 'at_once',
  within_scans,
  plan: (unit, _, seed) => {
    const random = new RandomStream(seed, `score ${id}`);
    const store = unit.stores[seed % unit.stores.length]!;
    const string = store.strings[Math.floor(random.uniform(0, store.strings.length))]!;
    const name = string.thermocouples[0]!.group!;
    const sensors = store.strings
      .flatMap((s) => s.thermocouples)
      .filter((t) => t.group === name)
      .map((t) => t.id);
    return { fault: make(name, random), store: store.id, sensors };
  },
});

/** What goes wrong, one at a time. Times to name are those of the goals, half an hour where none is set. */
export const FAULT_KINDS: readonly FaultKind[] = [
  single('open', 'open circuit', ['open'], 'at_once', 1, ANYWHERE, (channel) => ({
    kind: 'open',
    at_s: AT_S,
    channel,
  })),
  single('burst', 'burst upwards', ['burst'], 'at_once', 1, ANYWHERE, (channel) => ({
    kind: 'burst',
    at_s: AT_S,
    channel,
    value_K: 1573,
  })),
  single('burst-down', 'burst downwards', ['burst'], 'at_once', 1, ANYWHERE, (channel) => ({
    kind: 'burst',
    at_s: AT_S,
    channel,
    value_K: 3,
  })),
  single('stuck', 'stuck ahead of the front', ['stuck'], 'front', HALF_HOUR, AHEAD, (channel) => ({
    kind: 'stuck',
    at_s: AT_S,
    channel,
  })),
  // Named before it has drifted by 6 K.
  single(
    'drift',
    'drifting at 1 to 3 K/h',
    ['drifting', 'offset'],
    'off',
    0,
    ANYWHERE,
    (channel, random) => ({
      kind: 'drift',
      at_s: AT_S,
      channel,
      rate_K_h: sign(random) * random.uniform(1, 3),
    }),
  ),
  single(
    'offset',
    'offset of 8 to 15 K',
    ['offset', 'drifting'],
    'at_once',
    HALF_HOUR,
    ANYWHERE,
    (channel, random) => ({
      kind: 'offset',
      at_s: AT_S,
      channel,
      offset_K: sign(random) * random.uniform(8, 15),
    }),
  ),
  single('reversed', 'reversed polarity', ['reversed'], 'off', HALF_HOUR, AHEAD, (channel) => ({
    kind: 'reversed',
    at_s: AT_S,
    channel,
  })),
  {
    id: 'swapped',
    words: 'two of a string swapped',
    named: ['swapped', 'offset', 'drifting', 'outlier'],
    visible: 'off',
    within_scans: HALF_HOUR,
    plan: (unit, recording, seed) => {
      const random = new RandomStream(seed, 'score swapped');
      const store = unit.stores[seed % unit.stores.length]!;
      const [channel, other] = pick(store, recording, random, AHEAD);
      const fault = { kind: 'swapped', at_s: AT_S, channel, other } as const;
      return { fault, store: store.id, sensors: [channel, other] };
    },
  },
  group('card', 'a card off by 8 to 15 K', ['group_fault'], 5, (name, random) => ({
    kind: 'group_offset',
    at_s: AT_S,
    group: name,
    offset_K: sign(random) * random.uniform(8, 15),
  })),
  group('card-open', 'a card gone', ['group_fault', 'open'], 5, (name) => ({
    kind: 'group_open',
    at_s: AT_S,
    group: name,
  })),
  group('junction', 'a cold junction off by 4 to 6 K', ['group_fault'], 5, (name, random) => ({
    kind: 'group_offset',
    at_s: AT_S,
    group: name,
    offset_K: sign(random) * random.uniform(4, 6),
  })),
];
