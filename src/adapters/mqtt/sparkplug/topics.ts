/** Namespace of Sparkplug B. */
const NAMESPACE = 'spBv1.0';

export const NODE_KINDS = ['NBIRTH', 'NDATA', 'NDEATH'] as const;
export const DEVICE_KINDS = ['DBIRTH', 'DDATA', 'DDEATH'] as const;
export type MessageKind = (typeof NODE_KINDS)[number] | (typeof DEVICE_KINDS)[number];

/** An edge node: unique by group and name. */
export interface NodeName {
  readonly group: string;
  readonly node: string;
}

export function topicOf(
  { group, node }: NodeName,
  kind: MessageKind | 'NCMD',
  device: string | null = null,
): string {
  const topic = `${NAMESPACE}/${group}/${kind}/${node}`;
  return device === null ? topic : `${topic}/${device}`;
}

/**
 * What is subscribed of an edge node. Its sequence number runs over the messages of all its devices,
 * those that nothing is read from included.
 */
export function filtersOf(name: NodeName): string[] {
  return [
    ...NODE_KINDS.map((kind) => topicOf(name, kind)),
    ...DEVICE_KINDS.map((kind) => topicOf(name, kind, '+')),
  ];
}

export interface ParsedTopic extends NodeName {
  readonly kind: MessageKind;
  /** null: the message is the edge node's own. */
  readonly device: string | null;
}

/** The parts of a topic that an edge node publishes to; null for any other. */
export function parseTopic(topic: string): ParsedTopic | null {
  const [namespace, group, kind, node, device, ...more] = topic.split('/');
  if (namespace !== NAMESPACE || !group || !node || more.length > 0) return null;
  if (device === undefined) {
    const found = NODE_KINDS.find((one) => one === kind);
    return found ? { group, node, kind: found, device: null } : null;
  }
  const found = DEVICE_KINDS.find((one) => one === kind);
  return found && device !== '' ? { group, node, kind: found, device } : null;
}
