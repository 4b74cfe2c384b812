import { outside, plain } from './edge.js';

export interface Heard {
  readonly kind: string;
  readonly device: string | null;
  /** By name, aliases resolved by the running births. */
  readonly values: Readonly<Record<string, unknown>>;
  readonly bdSeq: unknown;
}

/** A host that holds an edge node to the specification: what is wrong goes into `wrongs`. */
export class StrictHost {
  readonly heard: Heard[] = [];
  readonly wrongs: string[] = [];
  private bdSeq: unknown = null;
  private seq: number | null = null;
  private readonly alive = new Set<string>();
  private aliases = new Map<unknown, { name: string; of: string | null }>();

  receive(topic: string, payload: Uint8Array, retained = false, qos = 0): void {
    const [namespace, , kind = '', , device = null] = topic.split('/');
    const { metrics, seq, timestamp } = outside.decodePayload(payload);
    const at = `${kind} ${device ?? ''}`;
    const wrong = (what: string) => this.wrongs.push(`${at}: ${what}`);
    if (namespace !== 'spBv1.0') wrong(`namespace ${namespace}`);
    if (retained) wrong('retained');
    if (typeof plain(timestamp) !== 'number') wrong('no timestamp');
    const own = (metrics ?? []).find(({ name }) => name === 'bdSeq');
    const bdSeq = own === undefined ? null : plain(own.value);
    if (kind === 'NDEATH') {
      // decodePayload leaves out what was not sent.
      if (seq !== undefined && seq !== null) wrong('has a seq');
      if (bdSeq !== this.bdSeq) wrong(`bdSeq ${bdSeq}, born with ${this.bdSeq}`);
      this.alive.clear();
      this.aliases.clear();
    } else {
      if (qos !== 0) wrong(`QoS ${qos}`);
      const expected: number | null =
        kind === 'NBIRTH' ? 0 : this.seq === null ? null : (this.seq + 1) % 256;
      if (plain(seq) !== expected) wrong(`seq ${plain(seq)}, expected ${expected}`);
      this.seq = plain(seq) as number;
    }
    if (kind === 'NBIRTH') {
      this.bdSeq = bdSeq;
      if (own?.type !== 'Int64') wrong(`bdSeq of type ${own?.type}`);
      const control = (metrics ?? []).find(({ name }) => name === 'Node Control/Rebirth');
      if (control?.value !== false || control.type !== 'Boolean') wrong('no rebirth control');
      if (control?.alias !== undefined && control.alias !== null) wrong('rebirth control by alias');
      this.alive.clear();
      this.alive.add('');
      this.aliases.clear();
    }
    if (kind === 'DBIRTH' && !this.alive.has('')) wrong('before NBIRTH');
    if (kind === 'DBIRTH') this.alive.add(device!);
    if (kind === 'DDATA' && !this.alive.has(device!)) wrong('before DBIRTH');
    if (kind === 'DDEATH' && !this.alive.delete(device!)) wrong('of a device that does not live');
    const values: Record<string, unknown> = {};
    for (const metric of metrics ?? []) {
      if (plain(metric.timestamp) === undefined) wrong(`${metric.name} without a timestamp`);
      const alias = plain(metric.alias);
      if (kind.endsWith('BIRTH') && metric.name && typeof alias === 'number') {
        const known = this.aliases.get(alias);
        if (known && known.of !== device) wrong(`alias ${alias} twice`);
        this.aliases.set(alias, { name: metric.name, of: device });
      }
      const name = metric.name || this.aliases.get(alias)?.name;
      if (name === undefined) wrong(`alias ${alias} unknown`);
      else values[name] = plain(metric.value);
    }
    this.heard.push({ kind, device, values, bdSeq });
  }

  of(kind: string): Heard[] {
    return this.heard.filter((one) => one.kind === kind);
  }
}
