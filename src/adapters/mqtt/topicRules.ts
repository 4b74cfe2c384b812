import { covers, type Role } from '../../access/role.js';

/** Topics of a site, as its own broker tells who may do what with them. */
export interface Topics {
  /** What rockhour publishes starts with this. */
  readonly out_prefix: string;
  /** Topics or filters that readings come by. */
  readonly readings: TopicSet;
  /** Topics that commands about alarms come by. */
  readonly commands: readonly string[];
}

/** What Sparkplug asks of an edge node: requests to it, and whether its host is there. */
const SPARKPLUG_ASKED = /^spBv1\.0\/(STATE\/[^#]+|[^/+#]+\/[ND]CMD\/[^/+#]+(\/.+)?)$/;

/** Whether the holder of a role may publish to a topic. */
export function mayPublish(role: Role, topic: string, topics: Topics): boolean {
  if (role === 'feed') return topics.readings.has(topic);
  return covers(role, 'acknowledge') && topics.commands.includes(topic);
}

/** Whether the holder of a role may subscribe to a filter. */
export function maySubscribe(role: Role, filter: string, topics: Topics): boolean {
  if (role === 'feed') return SPARKPLUG_ASKED.test(filter);
  return covers(role, 'view') && filter.startsWith(`${topics.out_prefix}/`);
}

/** Many topics and a few filters: whether one of them fits is asked for every message. */
export class TopicSet {
  private readonly exact: ReadonlySet<string>;
  private readonly filters: readonly string[];

  constructor(topics: readonly string[]) {
    this.filters = topics.filter((topic) => /[+#]/.test(topic));
    this.exact = new Set(topics);
  }

  has(topic: string): boolean {
    return this.exact.has(topic) || this.filters.some((filter) => matches(filter, topic));
  }
}

/** MQTT 3.1.1, section 4.7: `+` stands for one level, `#` at the end for all that follow. */
export function matches(filter: string, topic: string): boolean {
  const [wanted, levels] = [filter.split('/'), topic.split('/')];
  if (topic.startsWith('$') && /^[+#]/.test(filter)) return false;
  for (const [i, level] of wanted.entries()) {
    if (level === '#') return true;
    if (levels[i] === undefined || (level !== '+' && level !== levels[i])) return false;
  }
  return wanted.length === levels.length;
}
