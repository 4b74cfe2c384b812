import sparkplug from 'sparkplug-payload';
import type { UMetric, UPayload } from 'sparkplug-payload/lib/sparkplugbpayload.js';

const found = sparkplug.get('spBv1.0');
if (!found) throw new Error('sparkplug-payload knows no spBv1.0');
/** Encoder and decoder from outside. */
export const outside = found;

export interface Sent {
  readonly topic: string;
  readonly payload: Buffer;
}

/** An edge node as the specification has it: what it would publish, in order. */
export class EdgeNode {
  private seq = 0;

  constructor(
    readonly group = 'Quarry',
    readonly node = 'PLC1',
    public bdSeq = 0,
  ) {}

  birth(time_ms: number, metrics: readonly UMetric[] = []): Sent {
    this.seq = 0;
    const own: UMetric[] = [
      { name: 'bdSeq', type: 'Int64', value: this.bdSeq },
      { name: 'Node Control/Rebirth', type: 'Boolean', value: false },
    ];
    return this.say('NBIRTH', null, time_ms, [...own, ...metrics]);
  }

  death(): Sent {
    const metrics: UMetric[] = [{ name: 'bdSeq', type: 'Int64', value: this.bdSeq }];
    return { topic: this.topic('NDEATH', null), payload: encode({ timestamp: 1, metrics }) };
  }

  deviceBirth(device: string, time_ms: number, metrics: readonly UMetric[]): Sent {
    return this.say('DBIRTH', device, time_ms, metrics);
  }

  deviceDeath(device: string, time_ms: number): Sent {
    return this.say('DDEATH', device, time_ms, []);
  }

  data(device: string | null, time_ms: number, metrics: readonly UMetric[]): Sent {
    return this.say(device === null ? 'NDATA' : 'DDATA', device, time_ms, metrics);
  }

  /** A message that the network swallows. */
  swallow(): void {
    this.seq = (this.seq + 1) % 256;
  }

  private say(
    kind: string,
    device: string | null,
    timestamp: number,
    metrics: readonly UMetric[],
  ): Sent {
    const payload = encode({ timestamp, metrics: [...metrics], seq: this.seq });
    this.swallow();
    return { topic: this.topic(kind, device), payload };
  }

  topic(kind: string, device: string | null): string {
    const topic = `spBv1.0/${this.group}/${kind}/${this.node}`;
    return device === null ? topic : `${topic}/${device}`;
  }
}

export function encode(payload: UPayload): Buffer {
  return Buffer.from(outside.encodePayload(payload));
}

/** A number as the outside decoder gives it. */
export function plain(value: unknown): unknown {
  const isLong = typeof value === 'object' && value !== null && 'toNumber' in value;
  return isLong ? (value as { toNumber(): number }).toNumber() : value;
}
