import type { HealthPart } from '../adapters/http/service.js';
import type { LinkOptions } from '../adapters/mqtt/link.js';
import { nodeClientId, OwnLink } from '../adapters/mqtt/sparkplug/ownLink.js';
import { OwnNode } from '../adapters/mqtt/sparkplug/ownNode.js';
import type { NodeName } from '../adapters/mqtt/sparkplug/topics.js';
import type { UnitDefinition } from '../core/definitions.js';
import { reasonOf } from '../errors.js';
import type { Counters } from './counters.js';
import type { Notices } from './notices.js';

/** Name of the number of the last connection in the local store. */
const BDSEQ = 'sparkplug bdSeq';

export interface OwnNodePartOptions {
  readonly name: NodeName;
  readonly units: readonly UnitDefinition[];
  readonly site: string;
  readonly version: string;
  /** How the broker is reached, as rockhour's other link does. */
  readonly login: Pick<
    LinkOptions,
    'url' | 'inside' | 'username' | 'password' | 'tls' | 'protocol'
  >;
  readonly client_id: string;
  readonly history: {
    kept(name: string): number | null;
    keep(name: string, value: number): void;
  };
  readonly counters: Counters;
  readonly notices: Notices;
  now(): number;
  isStale(unit: string): boolean;
}

/** rockhour as an edge node of Sparkplug: what it says, and its connection. */
export class OwnNodePart {
  readonly node: OwnNode;
  private readonly link: OwnLink;

  constructor(private readonly options: OwnNodePartOptions) {
    const { name, units, site, version, login, client_id, history, counters, notices } = options;
    const { group, node } = name;
    this.node = new OwnNode({
      ...{ name, units, site, version, now: () => options.now() },
      isStale: (unit) => options.isStale(unit),
      count: (count) => counters.add(count),
    });
    this.link = new OwnLink({
      ...login,
      ...{ node: this.node, client_id: nodeClientId(client_id) },
      lastBdSeq: () => history.kept(BDSEQ),
      keepBdSeq: (bdSeq) => {
        try {
          history.keep(BDSEQ, bdSeq);
        } catch (thrown) {
          counters.add('history_failures');
          notices.warn('history_failures', `the number of a connection: ${reasonOf(thrown)}`);
        }
      },
      up: () => notices.info('sparkplug_up', `edge node ${group}/${node} is connected`),
      down: (reason) =>
        notices.warn('sparkplug_down', `edge node ${group}/${node} is not connected: ${reason}`),
    });
  }

  get health(): HealthPart {
    const { group, node } = this.options.name;
    const ok = this.link.connected;
    const detail = ok ? 'connected, with its births said' : 'not connected; keeps trying';
    return { name: `own edge node ${group}/${node}`, ok, detail };
  }

  start(): void {
    this.link.start();
  }

  stop(): Promise<void> {
    return this.link.stop();
  }
}
