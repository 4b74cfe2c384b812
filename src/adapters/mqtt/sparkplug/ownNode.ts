import type { UnitDefinition } from '../../../core/definitions.js';
import type { DispatchAnswer, Estimate } from '../../../core/estimate.js';
import type { AlarmsMessage } from '../announcer.js';
import { type DeviceImage, type DeviceMetric, deviceMetrics } from './deviceMetrics.js';
import { REBIRTH } from './host.js';
import { type Metric, readPayload, writePayload } from './messages.js';
import { type NodeName, topicOf } from './topics.js';
import { DATATYPE } from './values.js';

/** As much of a connection as the edge node needs. */
export interface NodeOutlet {
  /** Publishes at most once; `written` is called when it has left. */
  publish(topic: string, payload: Buffer, written: () => void): void;
}

export const OWN_NODE_COUNTS = [
  /** Births of rockhour's own edge node, and requests for one that were followed. */
  'sparkplug_own_births',
  'sparkplug_own_rebirths',
  /** Messages to it that ask for nothing that it does. */
  'sparkplug_commands_refused',
] as const;
export type OwnNodeCount = (typeof OWN_NODE_COUNTS)[number];

export interface OwnNodeOptions {
  readonly name: NodeName;
  readonly units: readonly UnitDefinition[];
  readonly site: string;
  readonly version: string;
  /** Wall clock [ms since 1970]. */
  now(): number;
  /** Whether the data of a unit are too old to be told as its present state. */
  isStale(unit: string): boolean;
  count(name: OwnNodeCount): void;
}

/** A host that asks again and again is followed at most so often [ms]. */
export const REBORN_EVERY_MS = 500;

interface Device {
  readonly unit: UnitDefinition;
  readonly image: DeviceImage;
  /** What was told of each metric in the running birth, by its place; null: the device is not alive. */
  told: (number | string | null)[] | null;
  /** Place of its first metric: aliases are unique in the whole node. */
  readonly firstAlias: number;
  /** Has news that wait until what was said before has left. */
  waits: boolean;
}

/**
 * rockhour as an edge node of Sparkplug B 3.0.0, with a device for each unit: what it says and in which
 * order. Births come first (NBIRTH, then a DBIRTH for each unit whose data are not stale), then changes
 * alone, by alias. While an earlier message has not left, nothing is queued: what is said after it is
 * the newest.
 */
export class OwnNode {
  private readonly devices: Map<string, Device>;
  private outlet: NodeOutlet | null = null;
  private bdSeq = 0;
  private seq = 0;
  private underWay = 0;
  private born_ms = Number.NEGATIVE_INFINITY;
  private later: NodeJS.Timeout | null = null;

  constructor(private readonly options: OwnNodeOptions) {
    let alias = 0;
    this.devices = new Map(
      options.units.map((unit) => {
        const image: DeviceImage = { estimate: null, dispatch: null, alarms: null };
        const device = { unit, image, told: null, firstAlias: alias, waits: false };
        alias += deviceMetrics(unit, image).length;
        return [unit.id, device];
      }),
    );
  }

  /** What the broker says for it once it is gone: the will of a connection, and its farewell (6.4.25). */
  death(bdSeq: number): { readonly topic: string; readonly payload: Buffer } {
    const timestamp = Math.floor(this.options.now());
    const payload = writePayload({ timestamp, metrics: [bdSeqMetric(bdSeq, timestamp)] });
    return { topic: topicOf(this.options.name, 'NDEATH'), payload };
  }

  /** Topic of the commands to it. */
  get commandTopic(): string {
    return topicOf(this.options.name, 'NCMD');
  }

  /** Connected, with this will, and subscribed. */
  connected(outlet: NodeOutlet, bdSeq: number): void {
    this.outlet = outlet;
    this.bdSeq = bdSeq;
    this.underWay = 0;
    this.beBorn();
  }

  disconnected(): void {
    this.outlet = null;
    if (this.later) clearTimeout(this.later);
    this.later = null;
    for (const device of this.devices.values()) device.told = null;
  }

  state(estimate: Estimate): void {
    this.change(estimate.unit, (image) => {
      image.estimate = estimate;
    });
  }

  dispatch(unit: string, time: string, answers: readonly DispatchAnswer[]): void {
    this.change(unit, (image) => {
      image.dispatch = { time, answers };
    });
  }

  alarms(message: AlarmsMessage): void {
    this.change(message.unit, (image) => {
      image.alarms = message;
    });
  }

  /** To be called now and then: data become stale without a message. */
  tick(): void {
    for (const device of this.devices.values()) this.say(device);
  }

  /** Takes a command to the node. */
  command(payload: Uint8Array): void {
    const read = readPayload(payload);
    const asks =
      typeof read !== 'string' &&
      (read.metrics ?? []).some(({ name, booleanValue }) => name === REBIRTH && booleanValue);
    if (!asks || !this.outlet) {
      this.options.count('sparkplug_commands_refused');
      return;
    }
    const wait_ms = this.born_ms + REBORN_EVERY_MS - performance.now();
    this.later ??= setTimeout(
      () => {
        this.later = null;
        this.options.count('sparkplug_own_rebirths');
        this.beBorn();
      },
      Math.max(0, wait_ms),
    );
  }

  private change(unit: string, change: (image: DeviceImage) => void): void {
    const device = this.devices.get(unit);
    if (!device) return;
    change(device.image);
    this.say(device);
  }

  private beBorn(): void {
    const { name, site, version, count } = this.options;
    const timestamp = Math.floor(this.options.now());
    this.born_ms = performance.now();
    this.seq = 0;
    const property = (key: string, stringValue: string): Metric => ({
      ...{ name: `Properties/${key}`, timestamp, datatype: DATATYPE.String, stringValue },
    });
    // Its name alone: a host has to know it before it has any alias (6.4.19).
    const control = { name: REBIRTH, timestamp, datatype: DATATYPE.Boolean, booleanValue: false };
    this.publish(topicOf(name, 'NBIRTH'), timestamp, [
      bdSeqMetric(this.bdSeq, timestamp),
      control,
      property('site', site),
      property('version', version),
    ]);
    count('sparkplug_own_births');
    for (const device of this.devices.values()) {
      device.told = null;
      if (this.isPresent(device)) this.deviceBirth(device);
    }
  }

  private isPresent({ unit, image }: Device): boolean {
    return image.estimate !== null && !this.options.isStale(unit.id);
  }

  private say(device: Device): void {
    if (!this.outlet) return;
    device.waits = this.underWay > 0;
    if (device.waits) return;
    if (!this.isPresent(device)) {
      if (device.told !== null) this.deviceDeath(device);
    } else if (device.told === null) this.deviceBirth(device);
    else this.deviceData(device);
  }

  private deviceBirth(device: Device): void {
    const metrics = deviceMetrics(device.unit, device.image);
    const timestamp = Math.floor(this.options.now());
    device.told = metrics.map(({ value }) => value);
    device.waits = false;
    const encoded = metrics.map((metric, i) => ({
      name: metric.name,
      ...encode(metric, device.firstAlias + i, timestamp),
    }));
    this.publish(topicOf(this.options.name, 'DBIRTH', device.unit.id), timestamp, encoded);
  }

  private deviceData(device: Device): void {
    const { told } = device;
    const timestamp = Math.floor(this.options.now());
    const changed = deviceMetrics(device.unit, device.image).flatMap((metric, i) => {
      if (Object.is(told![i], metric.value)) return [];
      told![i] = metric.value;
      return [encode(metric, device.firstAlias + i, timestamp)];
    });
    if (changed.length === 0) return;
    this.publish(topicOf(this.options.name, 'DDATA', device.unit.id), timestamp, changed);
  }

  private deviceDeath(device: Device): void {
    device.told = null;
    const timestamp = Math.floor(this.options.now());
    this.publish(topicOf(this.options.name, 'DDEATH', device.unit.id), timestamp, []);
  }

  private publish(topic: string, timestamp: number, metrics: readonly Metric[]): void {
    const { outlet, seq } = this;
    if (!outlet) return;
    this.seq = (seq + 1) % 256;
    this.underWay++;
    outlet.publish(topic, writePayload({ timestamp, metrics, seq }), () => {
      if (this.outlet !== outlet) return;
      this.underWay--;
      if (this.underWay > 0) return;
      for (const device of this.devices.values()) if (device.waits) this.say(device);
    });
  }
}

function bdSeqMetric(bdSeq: number, timestamp: number): Metric {
  return { name: 'bdSeq', timestamp, datatype: DATATYPE.Int64, longValue: bdSeq };
}

function encode({ datatype, value, time_ms }: DeviceMetric, alias: number, now_ms: number): Metric {
  const head = { alias, timestamp: time_ms ?? now_ms, datatype };
  if (value === null) return { ...head, isNull: true };
  if (typeof value === 'string') return { ...head, stringValue: value };
  return datatype === DATATYPE.Int32
    ? { ...head, intValue: value }
    : { ...head, doubleValue: value };
}
