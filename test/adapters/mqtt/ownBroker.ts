import { connectAsync, type IClientOptions, type MqttClient } from 'mqtt';
import { Access } from '../../../src/access/access.js';
import { type BrokerOptions, EmbeddedBroker } from '../../../src/adapters/mqtt/broker.js';
import { type Delivery, MqttLink } from '../../../src/adapters/mqtt/link.js';
import { TopicSet } from '../../../src/adapters/mqtt/topicRules.js';

export const READING = 'plant/unit1/hot/A';

/**
 * rockhour's own broker with its link within the process: what it refused, and what the link got.
 *
 * @param take what the link does with a message; absent: it acknowledges at once
 */
export async function startOwnBroker(
  later: (end: () => unknown) => void,
  options: BrokerOptions & { access?: Access; take?: (delivery: Delivery) => void } = {},
) {
  const refused: string[] = [];
  const came: string[] = [];
  const { access = new Access(), take = ({ acknowledge }) => acknowledge?.(), ...rest } = options;
  const broker = new EmbeddedBroker(
    '127.0.0.1',
    0,
    {
      ...{ access, own_ids: ['rockhour'], out_prefix: 'rockhour', commands: [] },
      readings: new TopicSet([READING]),
      refused: (what, text) => refused.push(`${what}: ${text}`),
    },
    {
      refused: (what, text) => refused.push(`${what}: ${text}`),
      held: (text) => refused.push(`held: ${text}`),
      ...rest,
    },
  );
  await broker.start();
  later(() => broker.stop());
  let link: MqttLink | undefined;
  await new Promise<void>((resolve) => {
    link = new MqttLink({
      ...{ client_id: 'rockhour', ...broker.login!, protocol: 4, qos: 1, topics: [READING] },
      ...{ url: () => broker.url, inside: broker.inside },
      will: { topic: 'rockhour/heartbeat', payload: 'offline' },
      receive: (delivery) => {
        const { payload } = delivery;
        came.push(payload.length > 20 ? `${payload.length} bytes` : payload.toString());
        take(delivery);
      },
      ...{ up: resolve, down: () => undefined, refused: () => undefined },
    });
    later(() => link?.stop());
    link.start();
  });
  const open = async (more: IClientOptions = {}): Promise<MqttClient> => {
    const client = await connectAsync(broker.url, { reconnectPeriod: 0, ...more });
    client.on('error', () => undefined);
    later(() => client.endAsync(true));
    return client;
  };
  const port = Number(new URL(broker.url).port);
  return { broker, link: link!, port, refused, came, open };
}
